"""From the runs of a study to figures: sample every series of every run on one grid and band it."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.results.bands import Grid, three_levels, time_levels
from fem.results.figures import Figures
from fem.results.history import Key
from fem.runs.grids import grid_of, steady_grid
from fem.runs.study import Study
from fem.solve.problem import Problem
from fem.solve.run import Run

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Derived:
    """A series made of others, so that its band comes from its own differences between the runs.

    Attributes
    ----------
    key : Key
        ``difference`` [K] or ``rate`` [K/s].
    first : Key
        The series it starts from.
    second : Key or None
        Subtracted for a difference.
    over : float
        A rate is the mean over this span before the instant, s; it exists from one span after the begin on.
    """

    key: Key
    first: Key
    second: Key | None = None
    over: float = 0.0


def rows(run: Run, grid: Grid, derived: tuple[Derived, ...] = ()) -> tuple[tuple[Key, ...], Floats]:
    """Return every recorded and derived series of a run on a grid: keys and values (n_keys, n)."""
    history = run.history
    base = history.sample(grid.t, grid.side)
    extra = [base]
    for d in derived:
        first = base[history.row(d.first)]
        if d.second is not None:
            extra.append((first - base[history.row(d.second)])[None])
        else:
            before = history.sample(grid.t - d.over)[history.row(d.first)]
            whole = grid.t - d.over >= history.t0[0] - 1e-9 * d.over
            extra.append(np.where(whole, (first - before) / d.over, 0.0)[None])
    return history.keys + tuple(d.key for d in derived), np.concatenate(extra)


def figures(study: Study, problem: Problem, derived: tuple[Derived, ...] = ()) -> Figures:
    """Return all series with their bands; a study of one run has none, and says so with infinite bands."""
    grid = steady_grid() if problem.steady else grid_of(problem, study.levels[0].steps)
    grid = grid.upto(min(float(r.history.t1[-1]) for r in study.runs))
    keys, value = rows(study.finest, grid, derived)
    if len(study.levels) < 3:
        nothing = np.full(value.shape, np.inf)
        return Figures(keys, grid, value, nothing, nothing, np.full(value.shape, np.nan))
    coarse, middle, fine = (rows(r, grid, derived)[1] for r in study.levels)
    space = three_levels(coarse, middle, fine, grid)
    time = np.zeros_like(value)
    if study.timing:
        whole, half, quarter = (rows(r, grid, derived)[1] for r in study.timing)
        part, shape = time_levels(whole, half, quarter, grid)
        value, time = value + shape, part.band
    return Figures(keys, grid, value, space.band, time, space.order)
