"""Three meshes and three step sequences of one problem: the runs from which bands and doubts are read."""

import time
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.mesh.make import Mesh
from fem.mesh.refine import local, uniform
from fem.solve.march import Outcome
from fem.solve.problem import Problem
from fem.solve.run import Gauges, Run, run
from fem.solve.steady import solve_steady
from fem.solve.stepping import Steps

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Progress:
    """How far the work at hand is.

    Attributes
    ----------
    doing : str
        In plain words.
    fraction : float
        Of this turn, 0 to 1.
    seconds_left : float or None
        Of this turn, estimated from what was measured so far.
    """

    doing: str
    fraction: float
    seconds_left: float | None


class Stopped(Exception):
    """Work was stopped; carries what was computed by then.

    Attributes
    ----------
    why : str
        "interrupted" or "allowance".
    partial : Run
        The finest run that reached its end, or else the one that was under way.
    """

    def __init__(self, why: str, partial: Run) -> None:
        super().__init__(why)
        self.why, self.partial = why, partial


class TooDear(Exception):
    """A study would not fit the allowance; says what it would take."""


@dataclass(frozen=True)
class Study:
    """Runs on nested meshes and halved steps.

    Attributes
    ----------
    levels : tuple of Run
        On h, h/2, h/4 with the same steps; one run only in a quick look.
    prolongations : tuple of sparse (N_finer, N)
        From each mesh to the next.
    timing : tuple of Run
        On the first mesh with steps dt, dt/2, dt/4; empty when steady or in a quick look.
    """

    levels: tuple[Run, ...]
    prolongations: tuple[sp.csr_array, ...]
    timing: tuple[Run, ...]

    @property
    def finest(self) -> Run:
        """Return the run whose numbers are reported."""
        return self.levels[-1]

    @property
    def runs(self) -> tuple[Run, ...]:
        """Return every run once."""
        return self.levels + self.timing[1:]

    @property
    def finished(self) -> bool:
        """True when every run reached its end."""
        return all(r.outcome is Outcome.finished for r in self.runs)


class Bench:
    """Does the runs of one problem: keeps the tolerance, the pace and the way to stop.

    Parameters
    ----------
    problem, gauges
        What to solve, where to look.
    tolerance : float
        Local error per step, K.
    deadline : float
        `time.perf_counter()` value after which a run is stopped.
    on_progress : callable, optional
        Called with `Progress` a few times a second at most.
    stop : callable, optional
        True ends the work.
    """

    def __init__(
        self,
        problem: Problem,
        gauges: Gauges,
        *,
        tolerance: float,
        deadline: float = np.inf,
        on_progress: Callable[[Progress], None] | None = None,
        stop: Callable[[], bool] | None = None,
    ) -> None:
        self.problem, self.gauges, self.tolerance, self.deadline = problem, gauges, tolerance, deadline
        self._on_progress, self._stop = on_progress, stop
        self._done = self._planned = 0.0
        self._began = time.perf_counter()
        self._best: Run | None = (
            None  # the finest run that reached its end, kept for a stop before the first study is whole
        )
        self.pace = 0.0  # seconds per unit of work, from the last run

    # --- work and time ----------------------------------------------------------------------------------------------------------
    @staticmethod
    def work(cells: int, steps: int) -> float:
        """Return the work of a run; sparse Cholesky in 2D grows a little faster than the number of cells."""
        return float(float(cells) ** 1.15 * max(steps, 1))

    def plan(self, work: float) -> None:
        """Begin a turn of the given work."""
        self._done, self._planned, self._began = 0.0, work, time.perf_counter()

    def _tell(self, doing: str, part: float, work: float) -> None:
        if self._on_progress is None:
            return
        done = self._done + part * work
        fraction = min(done / self._planned, 1.0) if self._planned > 0 else 0.0
        spent = time.perf_counter() - self._began
        left = spent * (1.0 - fraction) / fraction if fraction > 0.01 else None
        self._on_progress(Progress(doing, fraction, left))

    def solve(
        self,
        mesh: Mesh,
        doing: str,
        *,
        steps: Steps | None = None,
        frame_times: Floats | None = None,
        first: float = 1.0,
    ) -> Run:
        """Run once on a mesh.

        Raises
        ------
        Stopped
            If the user or the deadline ended it.
        """
        if self.problem.steady:
            self._tell(doing, 0.0, 1.0)
            result = solve_steady(mesh, self.problem, self.gauges, tolerance=1e-4 * self.tolerance)
            self._note(result, 1)
            self._check(result)
            return result
        watch = self._watch(doing, len(mesh.cells), steps)
        result = run(
            mesh,
            self.problem,
            self.gauges,
            tolerance=self.tolerance,
            first=first,
            steps=steps,
            frame_times=frame_times,
            watch=watch,
        )
        self._check(result)
        self._note(result, len(result.steps))
        return result

    def _note(self, result: Run, steps: int) -> None:
        work = self.work(len(result.mesh.cells), steps)
        self._done += work
        self.pace = result.seconds / work

    def _check(self, result: Run) -> None:
        if self._stop is not None and self._stop():
            raise Stopped("interrupted", self._best or result)
        if result.outcome is Outcome.stopped or time.perf_counter() > self.deadline:
            raise Stopped("allowance", self._best or result)
        if self._best is None or len(result.mesh.cells) > len(self._best.mesh.cells):
            self._best = result

    def _watch(self, doing: str, cells: int, steps: Steps | None) -> Callable[[float], bool]:
        begin, end = self.problem.begin or 0.0, self.problem.end or 1.0
        work = self.work(cells, len(steps) if steps is not None else 50)
        count, last = 0, 0.0

        def watch(t: float) -> bool:
            nonlocal count, last
            count += 1
            now = time.perf_counter()
            if now - last > 0.1:
                last = now
                self._tell(
                    doing, min(count / len(steps), 1.0) if steps is not None else (t - begin) / (end - begin), work
                )
            return now < self.deadline and not (self._stop is not None and self._stop())

        return watch

    # --- studies ----------------------------------------------------------------------------------------------------------------
    def look(self, mesh: Mesh) -> Study:
        """Return one run on one mesh."""
        self.plan(self.work(len(mesh.cells), 50))
        return Study((self.solve(mesh, "quick look", first=self.first_step(mesh)),), (), ())

    def first(self, mesh: Mesh, *, most_seconds: float = np.inf) -> Study:
        """Return the first study on a mesh: choose the steps, then replay them on two finer meshes and with two finer steps.

        Raises
        ------
        TooDear
            If, going by the first run, the rest would take more than `most_seconds`.
        Stopped
            If the user or the deadline ended it.
        """
        self.plan(self.work(len(mesh.cells), 50))
        chosen = self.solve(mesh, "first mesh", first=self.first_step(mesh))
        seconds = self.pace * self._study_work(len(mesh.cells), len(chosen.steps))
        if seconds > most_seconds:
            raise TooDear(f"about {seconds:.0f} s")
        return self._around(chosen)

    def first_step(self, mesh: Mesh) -> float:
        """Return the first step after a jump of data: h^2/alpha of the finest mesh to come, median over the cells on curves, s."""
        on_curve = np.isin(mesh.cells, np.unique(mesh.facets)).any(axis=1)
        cells = np.flatnonzero(on_curve)
        x, y = mesh.points[mesh.cells[cells]].mean(axis=1).T
        alpha = np.empty(len(cells))
        for r, (k, rho_c, start) in enumerate(
            zip(self.problem.conductivity, self.problem.heat_capacity, self.problem.start, strict=True)
        ):
            mine = mesh.region[cells] == r
            T = start(x=x[mine], y=y[mine])
            alpha[mine] = k(t=self.problem.begin, x=x[mine], y=y[mine], T=T) / rho_c(x=x[mine], y=y[mine], T=T)
        return float(np.median((mesh.h[cells] / 4.0) ** 2 / alpha))

    def _on(self, mesh: Mesh, steps: Steps) -> Study:
        """Return a whole study whose first mesh is the given one."""
        self.plan(self.work(len(mesh.cells), len(steps)))
        return self._around(self.solve(mesh, "first mesh", steps=steps))

    def _around(self, chosen: Run) -> Study:
        """Return the study whose first run is given: two finer meshes and two finer steps beside it."""
        if chosen.outcome is not Outcome.finished:
            return Study((chosen,), (), ())
        mesh, steps = chosen.mesh, chosen.steps
        self.plan(self._study_work(len(mesh.cells), len(steps)))
        middle, up = uniform(mesh)
        fine, up2 = uniform(middle)
        timing = (chosen, *self._halvings(mesh, steps, chosen.frame_times))
        levels = (
            chosen,
            self.solve(middle, "cells halved", steps=steps, frame_times=chosen.frame_times),
            self.solve(fine, "cells quartered", steps=steps, frame_times=chosen.frame_times),
        )
        return Study(levels, (up, up2), () if self.problem.steady else timing)

    def _study_work(self, cells: int, steps: int) -> float:
        """Return the work of a study besides its first run."""
        timing = 0.0 if self.problem.steady else 6.0 * self.work(cells, steps)
        return self.work(4 * cells, steps) + self.work(16 * cells, steps) + timing

    def _halvings(self, mesh: Mesh, steps: Steps, frame_times: Floats) -> tuple[Run, ...]:
        if self.problem.steady:
            return ()
        half = steps.halved()
        return (
            self.solve(mesh, "steps halved", steps=half, frame_times=frame_times),
            self.solve(mesh, "steps quartered", steps=half.halved(), frame_times=frame_times),
        )

    def finer_everywhere(self, study: Study) -> Study:
        """Return the study with every cell split: two of the three runs are already there."""
        last = study.finest
        finer, up = uniform(last.mesh)
        self.plan(self.work(len(finer.cells), len(last.steps)))
        new = self.solve(finer, "all cells split", steps=last.steps, frame_times=last.frame_times)
        return replace(study, levels=(*study.levels[1:], new), prolongations=(*study.prolongations[1:], up))

    def finer_cells(self, study: Study, mesh: Mesh) -> Study:
        """Return a study on a locally refined first mesh, with the same steps."""
        return self._on(mesh, study.levels[0].steps)

    def finer_steps(self, study: Study, owing: NDArray[np.bool_]) -> Study:
        """Return the study with the owing steps halved, on the same first mesh."""
        steps = study.levels[0].steps.halved_where(owing)
        return self._on(study.levels[0].mesh, steps)


def split_cells(mesh: Mesh, passes: NDArray[np.int_]) -> Mesh:
    """Return the mesh with each cell split as many times over as `passes` (M,) says; neighbours follow to keep it conforming."""
    left = passes.copy()
    while left.max(initial=0) > 0:
        finer, parent = local(mesh, left > 0)
        split = np.bincount(parent, minlength=len(mesh.cells)) > 1
        left = np.where(split[parent], left[parent] - 1, left[parent])
        mesh = finer
    return mesh
