"""Laws of time that are straight between knots: right-continuous where a time is given twice, and their thinning."""

from bisect import bisect_right
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.errors import DocketError
from fem.laws import Break, Law

Floats = NDArray[np.float64]

EDGE = 1e-9
"""A time closer to an end than this part of the span is the end: rounding of step times, not a reading outside."""

COLLINEAR = 1e-12
"""Slopes that differ by less than this part of the larger one are one straight line."""


def polyline(t: Floats, v: Floats, *, hold_before: bool, hold_after: bool, name: str) -> Law:
    """Return the law of t [s] through the knots.

    Parameters
    ----------
    t : (n,) array
        s, not decreasing; a time given twice is a jump, and the law has the second value there.
    v : (n,) array
        SI.
    hold_before, hold_after : bool
        Whether the first or last value stands outside the knots.
    name : str
        For messages.

    Raises
    ------
    DocketError
        By the law, when it is asked for a time outside the knots where nothing stands.
    """
    times, values = t.tolist(), v.tolist()
    slopes = np.append(_slopes(t, v), 0.0).tolist()
    last = len(times) - 1
    slack = EDGE * (times[-1] - times[0])

    def at(t: float) -> float:
        i = bisect_right(times, t) - 1
        if i < 0:
            if hold_before or t >= times[0] - slack:
                return float(values[0])
            raise _outside(name, t, times[0], times[-1])
        if i == last:
            if hold_after or t <= times[-1] + slack:
                return float(values[-1])
            raise _outside(name, t, times[0], times[-1])
        return float(values[i] + slopes[i] * (t - times[i]))

    def evaluate(t: Any) -> Any:
        if np.ndim(t) == 0:
            return at(float(t))
        flat = np.asarray(t, dtype=np.float64)
        return np.array([at(x) for x in flat.ravel().tolist()]).reshape(flat.shape)

    return Law(evaluate, frozenset({"t"}), knots(t, v), name)


def _slopes(t: Floats, v: Floats) -> Floats:
    dt = np.diff(t)
    return np.divide(np.diff(v), dt, out=np.zeros_like(dt), where=dt > 0.0)


def knots(t: Floats, v: Floats) -> tuple[Break, ...]:
    """Return the instants at which the polyline through (n,) times and values jumps or kinks; level outside."""
    first = np.flatnonzero(np.append(True, np.diff(t) > 0.0))  # index of the first and the last knot at each instant
    final = np.append(first[1:], len(t)) - 1
    slopes = _slopes(t, v)
    left = np.where(first > 0, slopes[np.maximum(first - 1, 0)] if len(slopes) else 0.0, 0.0)
    right = np.where(final < len(t) - 1, slopes[np.minimum(final, len(slopes) - 1)] if len(slopes) else 0.0, 0.0)
    jump = v[first] != v[final]
    kink = np.abs(right - left) > COLLINEAR * np.maximum(np.abs(left), np.abs(right))
    chosen = np.flatnonzero(jump | kink)
    return tuple(Break(float(t[first[i]]), bool(jump[i])) for i in chosen)


def _outside(name: str, t: float, first: float, last: float) -> DocketError:
    return DocketError.single(
        name,
        f"t = {t:.9g} s",
        f"times from {first:.9g} s to {last:.9g} s",
        'shorten the clock, or state before/after = "hold"',
    )


def thin(t: Floats, v: Floats, within: float) -> NDArray[np.intp]:
    """Return the indices of the knots to keep so that the polyline moves nowhere by more than `within`.

    Ramer (1972), Douglas and Peucker (1973), with the deviation measured along the value axis, because a schedule's
    error is one of value. Both knots of a jump are always kept.

    Parameters
    ----------
    t, v : (n,) array
        s, not decreasing; SI.
    within : float
        Largest deviation, in the unit of v.
    """
    keep = np.zeros(len(t), dtype=bool)
    keep[[0, -1]] = True
    jumps = np.flatnonzero(np.diff(t) <= 0.0)
    keep[jumps] = keep[jumps + 1] = True
    fixed = np.flatnonzero(keep)
    stack = list(zip(fixed[:-1].tolist(), fixed[1:].tolist(), strict=True))
    while stack:
        a, b = stack.pop()
        if b - a < 2:
            continue
        inner = slice(a + 1, b)
        off = np.abs(v[a] + (v[b] - v[a]) * ((t[inner] - t[a]) / (t[b] - t[a])) - v[inner])
        worst = int(np.argmax(off))
        if off[worst] > within:
            middle = a + 1 + worst
            keep[middle] = True
            stack += [(a, middle), (middle, b)]
    return np.flatnonzero(keep)
