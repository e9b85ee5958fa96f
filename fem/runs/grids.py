"""The instants at which the histories of a study are judged."""

import numpy as np
from numpy.typing import NDArray

from fem.results.bands import Grid
from fem.solve.problem import Problem
from fem.solve.stepping import Steps

Floats = NDArray[np.float64]


def steady_grid() -> Grid:
    """Return the grid of a steady state: its one instant."""
    one = np.array([1.0])
    return Grid(one, np.array([-1]), np.array([0.0]), one, np.array([True]), np.array([0]), np.array([0]))


def grid_of(problem: Problem, steps: Steps) -> Grid:
    """Return the judging instants of a march that took the given steps."""
    if problem.begin is None or problem.end is None:
        return steady_grid()
    times = steps.times
    inner = (times[:-1, None] + np.diff(times)[:, None] * np.array([0.25, 0.5, 0.75])).ravel()
    reports = report_times(problem)
    reports = reports[reports <= times[-1]]
    t = np.unique(np.concatenate((times[1:], inner, reports)))
    jumps = np.array(sorted(b for b, jump in steps.breaks.items() if jump and b < times[-1]))
    t = np.concatenate((t, [times[0]], jumps))
    side = np.concatenate((-np.ones(len(t) - 1 - len(jumps), dtype=int), np.ones(1 + len(jumps), dtype=int)))
    order = np.lexsort((side, t))
    t, side = t[order], side[order]
    edges = np.concatenate(([times[0]], jumps, [times[-1]]))
    stretch = np.clip(
        np.where(side < 0, np.searchsorted(edges, t, "left"), np.searchsorted(edges, t, "right")) - 1, 0, len(edges) - 2
    )
    reported = (side < 0) & np.isin(t, reports)
    is_end = np.isin(t, times)
    index = np.arange(len(t))
    first = np.maximum.accumulate(np.where(is_end, index, 0))
    last = np.minimum.accumulate(np.where(is_end, index, len(t) - 1)[::-1])[::-1]
    return Grid(t, side, edges[stretch], edges[stretch + 1], reported, first, last)


def report_times(problem: Problem) -> Floats:
    """Return the reporting times: every interval after the begin, the instants and the end, s."""
    assert problem.begin is not None and problem.end is not None  # noqa: S101, PT018 - transient only
    count = (
        int(np.floor((problem.end - problem.begin) / problem.report_every * (1 + 1e-12)))
        if problem.report_every > 0
        else 0
    )
    regular = problem.begin + problem.report_every * np.arange(1, count + 1)
    inside = [t for t in problem.instants if problem.begin < t <= problem.end]
    return np.unique(np.concatenate((regular, inside, [problem.end])))
