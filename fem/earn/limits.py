"""Verdicts on limits: met, not met, or too close to call, against the band.

Each limit is reduced to a critical number of a series: the margin by which it holds (positive) or fails (negative), and the band of that
number. It is met when the whole band is on the good side, not met when the whole band is on the bad side.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.checks.facts import Goal
from fem.docket import Docket, Limit
from fem.results.figures import Figures
from fem.results.history import Key
from fem.results.verdicts import Call, Verdict
from fem.runs.tables import Derived

Floats = NDArray[np.float64]


# --- which series a limit looks at --------------------------------------------------------------------------------------------------


def subject(docket: Docket, limit: Limit) -> Key:
    """Return the series that a limit is judged by."""
    lowest = limit.must in ("stay above", "hold above", "reach")
    if limit.must in ("heat slower than", "cool slower than"):
        return Key("rate", f"{limit.at} over {rate_span(docket, limit):g} s")
    if limit.must == "differ less than":
        return Key("difference", f"{limit.at} - {limit.other}")
    return plain_subject(docket, limit.at, lowest=lowest)


def plain_subject(docket: Docket, at: str, *, lowest: bool) -> Key:
    """Return the gauge's series, or the lowest or highest of a region or of the whole section."""
    if at in {gauge.name for gauge in docket.gauges}:
        return Key("gauge", at)
    solid = [region.name for region in docket.section.regions if region.stock is not None]
    name = ("" if len(solid) > 1 else solid[0]) if at == "anywhere" else at
    return Key("lowest" if lowest else "highest", name)


def rate_span(docket: Docket, limit: Limit) -> float:
    """Return the span over which a rate is averaged, s: as stated, or the reporting interval."""
    if limit.over is not None:
        return float(limit.over)
    assert docket.clock is not None  # noqa: S101 - the docket refuses rate limits on a steady job
    return float(docket.clock.report_every)


def limit_text(docket: Docket, limit: Limit) -> str:
    """Return a limit as a sentence in the docket's units; a rate with the span over which it is averaged."""
    return limit.sentence(docket.units, span=None if limit.rate is None else rate_span(docket, limit))


def derived(docket: Docket) -> tuple[Derived, ...]:
    """Return the series that the docket's limits need besides the recorded ones."""
    out = {}
    for limit in docket.limits:
        key = subject(docket, limit)
        if key.kind == "rate":
            out[key] = Derived(key, Key("gauge", limit.at), over=rate_span(docket, limit))
        elif key.kind == "difference":
            out[key] = Derived(key, Key("gauge", limit.at), second=Key("gauge", str(limit.other)))
    return tuple(out.values())


# --- verdicts -----------------------------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _View:
    """The part of one series that a limit looks at."""

    t: Floats
    v: Floats
    b: Floats


def _view(figures: Figures, key: Key, limit: Limit, *, dense: bool = False) -> _View:
    """Return what the limit looks at; `dense`: between the instants of the grid too, for what crosses a level there."""
    t, value, band = figures.dense(key) if dense else (figures.grid.t, *figures.series(key))
    inside = np.ones(len(t), dtype=bool)
    if limit.during is not None:
        inside = (t >= limit.during[0]) & (t <= limit.during[1])
    return _View(t[inside], value[inside], band[inside])


def judge_limit(docket: Docket, limit: Limit, figures: Figures) -> Verdict:
    """Return the verdict on one limit."""
    view = _view(figures, subject(docket, limit), limit)
    if not len(view.t):  # the work ended before the limit came into force
        return _verdict(docket, limit, np.nan, np.inf, float(figures.grid.t[-1]), None)
    if limit.must == "reach":
        return _reach(docket, limit, view, figures)
    if limit.must == "hold above":
        return _hold(docket, limit, _view(figures, subject(docket, limit), limit, dense=True))
    sign, threshold = {
        "stay below": (1.0, limit.temperature),
        "stay above": (-1.0, limit.temperature),
        "heat slower than": (1.0, limit.rate),
        "cool slower than": (-1.0, None if limit.rate is None else -limit.rate),
    }.get(limit.must, (0.0, limit.below))
    assert threshold is not None  # noqa: S101 - the docket's models guarantee it
    values = np.abs(view.v) if sign == 0.0 else sign * view.v
    bound = threshold if sign == 0.0 else sign * threshold
    i = int(np.argmax(values))
    worst, best = float(np.max(values + view.b)), float(np.max(values - view.b))
    return _verdict(docket, limit, bound - values[i], max(worst - values[i], values[i] - best), float(view.t[i]), None)


def _reach(docket: Docket, limit: Limit, view: _View, figures: Figures) -> Verdict:
    by = view.t <= (np.inf if limit.within is None else figures.grid.t[0] + limit.within)
    i = int(np.argmax(np.where(by, view.v, -np.inf)))
    high, low = float(np.max((view.v + view.b)[by])), float(np.max((view.v - view.b)[by]))
    wide, threshold = max(high - view.v[i], view.v[i] - low), float(limit.temperature or 0.0)
    fine = _view(figures, subject(docket, limit), limit, dense=True)
    at, early, late = (first_reach(fine.t, v, threshold) for v in (fine.v, fine.v + fine.b, fine.v - fine.b))
    return _verdict(docket, limit, view.v[i] - threshold, wide, float(view.t[i]), (at, early, late))


def _hold(docket: Docket, limit: Limit, view: _View) -> Verdict:
    span, threshold = float(limit.at_least or 0.0), float(limit.temperature or 0.0)
    value, t = held_level(view.t, view.v, span)
    if not np.isfinite(value):  # the limit is in force for less than the span
        return _verdict(docket, limit, -np.inf, 0.0, t, None)
    if not np.all(np.isfinite(view.b)):
        return _verdict(docket, limit, value - threshold, np.inf, t, None)
    high, _ = held_level(view.t, view.v + view.b, span)
    low, _ = held_level(view.t, view.v - view.b, span)
    return _verdict(docket, limit, value - threshold, max(high - value, value - low), t, None)


def _verdict(
    docket: Docket, limit: Limit, margin: float, band: float, t: float, crossing: tuple[float, float, float] | None
) -> Verdict:
    call = Call.too_close
    if np.isfinite(band) and margin - band >= 0.0:
        call = Call.met
    elif np.isfinite(band) and margin + band < 0.0:
        call = Call.not_met
    return Verdict(
        limit.name, limit_text(docket, limit), call, float(margin), float(band), t, crossing, limit.rate is not None
    )


def first_reach(t: Floats, v: Floats, threshold: float) -> float:
    """Return the first instant at which v reaches the threshold, s, linear between instants; infinite if it never does."""
    above = np.flatnonzero(v >= threshold)
    if not len(above):
        return np.inf
    i = int(above[0])
    if i == 0 or v[i] == v[i - 1]:
        return float(t[i])
    return float(t[i - 1] + (t[i] - t[i - 1]) * (threshold - v[i - 1]) / (v[i] - v[i - 1]))


def held_level(t: Floats, v: Floats, span: float) -> tuple[float, float]:
    """Return the highest level that v, straight between instants, keeps to or above for `span` [s] on end, and where that is tightest [s].

    Found by bisection on the level. Minus infinity when the record is shorter than the span.
    """
    if t[-1] - t[0] < span * (1.0 - 1e-12):
        return -np.inf, float(t[-1])
    low, high = float(np.min(v)), float(np.max(v))
    best = longest_above(t, v, low)
    for _ in range(60):
        middle = 0.5 * (low + high)
        stay = longest_above(t, v, middle)
        if stay[1] - stay[0] >= span * (1.0 - 1e-12):
            low, best = middle, stay
        else:
            high = middle
    held = (t >= best[0]) & (t <= best[1])
    inside = np.flatnonzero(held)
    ends = [(float(v[i]), float(t[i])) for i in inside] or [(low, best[0])]
    return low, min([(low, best[0]), *ends])[1]


def longest_above(t: Floats, v: Floats, level: float) -> tuple[float, float]:
    """Return begin and end, s, of the longest time for which v, straight between instants, is at or above the level."""
    above = np.concatenate(([False], v >= level, [False]))
    starts, stops = np.flatnonzero(above[1:] & ~above[:-1]), np.flatnonzero(above[:-1] & ~above[1:]) - 1
    best = (float(t[0]), float(t[0]))
    for i, j in zip(starts.tolist(), stops.tolist(), strict=True):
        begin, end = _cross(t, v, level, i - 1, i), _cross(t, v, level, j + 1, j)
        if end - begin > best[1] - best[0]:
            best = (begin, end)
    return best


def _cross(t: Floats, v: Floats, level: float, out: int, into: int) -> float:
    """Return where v crosses the level between an instant outside and one inside; the inner one at an end of the record."""
    if not 0 <= out < len(t) or v[into] == v[out]:
        return float(t[into])
    return float(t[into] + (t[out] - t[into]) * (level - v[into]) / (v[out] - v[into]))


def closing_goal(docket: Docket, limit: Limit, verdict: Verdict, floor: float) -> Goal | None:
    """Return the band that would settle a limit that is too close to call; None for one that is settled.

    Parameters
    ----------
    floor : float
        Narrowest band worth asking for, K: a margin of nothing can't be settled by any mesh.
    """
    if verdict.call is not Call.too_close:
        return None
    wanted = max(0.7 * abs(verdict.margin), floor / (1.0 if not verdict.is_rate else rate_span(docket, limit)))
    if not np.isfinite(wanted):
        return None
    start, end = limit.during if limit.during is not None else (-np.inf, np.inf)
    key = subject(docket, limit)
    if limit.must in ("reach", "hold above") or verdict.is_rate:
        start, end = max(start, 0.5 * verdict.t), min(end, 1.001 * verdict.t)
    return Goal(key, wanted, f'limit "{limit.name}" is too close to call', start, end, everywhere=True)
