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


def _view(figures: Figures, key: Key, limit: Limit) -> _View:
    value, band = figures.series(key)
    t = figures.grid.t
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
        return _reach(docket, limit, view, figures.grid.t[0])
    if limit.must == "hold above":
        return _hold(docket, limit, view)
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


def _reach(docket: Docket, limit: Limit, view: _View, begin: float) -> Verdict:
    by = view.t <= (np.inf if limit.within is None else begin + limit.within)
    i = int(np.argmax(np.where(by, view.v, -np.inf)))
    high, low = float(np.max((view.v + view.b)[by])), float(np.max((view.v - view.b)[by]))
    wide = max(high - view.v[i], view.v[i] - low)
    crossing = tuple(
        first_reach(view.t, v, float(limit.temperature or 0.0)) for v in (view.v, view.v + view.b, view.v - view.b)
    )
    return _verdict(
        docket,
        limit,
        view.v[i] - float(limit.temperature or 0.0),
        wide,
        float(view.t[i]),
        (crossing[0], crossing[1], crossing[2]),
    )


def _hold(docket: Docket, limit: Limit, view: _View) -> Verdict:
    span, threshold = float(limit.at_least or 0.0), float(limit.temperature or 0.0)
    value, i = held_level(view.t, view.v, span)
    if not np.isfinite(value):  # the limit is in force for less than the span
        return _verdict(docket, limit, -np.inf, 0.0, float(view.t[-1]), None)
    high, _ = held_level(view.t, view.v + view.b, span)
    low, _ = held_level(view.t, view.v - view.b, span)
    return _verdict(docket, limit, value - threshold, max(high - value, value - low), float(view.t[i]), None)


def _verdict(
    docket: Docket, limit: Limit, margin: float, band: float, t: float, crossing: tuple[float, float, float] | None
) -> Verdict:
    call = Call.too_close
    if np.isfinite(band) and margin - band >= 0.0:
        call = Call.met
    elif np.isfinite(band) and margin + band < 0.0:
        call = Call.not_met
    return Verdict(
        limit.name, limit.sentence(docket.units), call, float(margin), float(band), t, crossing, limit.rate is not None
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


def held_level(t: Floats, v: Floats, span: float) -> tuple[float, int]:
    """Return the highest level that v keeps to, or above, for at least `span` [s] on end, and the instant where that is tightest.

    Minus infinity when the record is shorter than the span.
    """
    best, where = -np.inf, 0
    for i in range(len(t)):
        last = int(np.searchsorted(t, t[i] + span, side="left"))
        if t[-1] < t[i] + span - 1e-9 * span:
            break
        last = min(last, len(t) - 1)
        low = i + int(np.argmin(v[i : last + 1]))
        if v[low] > best:
            best, where = float(v[low]), low
    return best, where


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
