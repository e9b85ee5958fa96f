"""March through time: a generator that yields one accepted step at a time and ends in a stated outcome."""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from enum import Enum

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solve.conduction import Conduction, Loads
from fem.solve.factor import Factor, FactorFailed, Factorizer
from fem.solve.linear import LinearStages, Stages
from fem.solve.stepping import INSIDE, SDIRK4, Ladder, Steps, Tableau

Floats = NDArray[np.float64]

NEWTON_ROUNDS = 12
NEWTON_PART = 3e-6
"""Newton's remaining error as a part of the step tolerance: small enough for the heat ledger to close to 1e-6 of the heat turned over."""
SMALLEST_PIECE = 0.1
"""A replayed step on which Newton fails is halved, down to pieces of this part of it."""
SURELY = 0.1
"""A change that is this part of the tolerance ends Newton's method even when its rate is not known yet."""
REUSE_BELOW = 0.05
"""A factor from an earlier step is used again while Newton's error shrinks by this factor or better per round."""


class Outcome(Enum):
    """How a march ended. Everything but `finished` leaves what was computed, marked as unfinished."""

    finished = "finished"
    newton_failed = "the nonlinear equations of a step could not be solved, even with the smallest step"
    not_finite = "a temperature became infinite or undefined"
    stopped = "stopped before the end"


@dataclass(frozen=True)
class Step:
    """One accepted step.

    Attributes
    ----------
    t0, t1 : float
        s.
    T0, T1 : (N,) float
        Temperatures right after t0 (after any jump there) and at t1, K.
    d0 : (N,) float or None
        Rate right after t0, K/s; None after a jump of data, where it need not be finite.
    d1 : (N,) float
        Rate right before t1, K/s.
    heat : (n_faces,) float
        Heat in through each face during the step, J.
    impulse : (n_faces,) float
        Heat taken in at t0 itself by held nodes whose given temperature jumps there, J.
    made : (n_regions,) float
        Heat made in each region during the step, J.
    flow0, flow : (n_faces,) float
        Heat flow in through each face right after t0 and right before t1, W; `flow0` is NaN where a held temperature has just jumped.
    """

    t0: float
    t1: float
    T0: Floats
    T1: Floats
    d0: Floats | None
    d1: Floats
    heat: Floats
    impulse: Floats
    made: Floats
    flow0: Floats
    flow: Floats


class StageSolver:
    """Newton's method for one stage, with one factorization per step at most as long as it converges well."""

    def __init__(self, problem: Conduction, tolerance: float) -> None:
        self.problem, self.tolerance = problem, tolerance
        self.rate = 1.0
        self._key: float | None = None
        self._factor: Factor | None = None
        self._lower_of(problem.stiffness(0.0, problem.start()))

    def _lower_of(self, K: sp.csr_array) -> None:
        """Find where the lower triangle of the free block sits in the data of K (symmetric, so rows serve as columns)."""
        number = np.full(self.problem.n, -1)
        number[self.problem.free] = np.arange(len(self.problem.free))
        rows = np.repeat(np.arange(self.problem.n), np.diff(K.indptr))
        columns = K.indices
        self._pick = np.flatnonzero((columns >= rows) & (number[rows] >= 0) & (number[columns] >= 0))
        column, row = number[rows[self._pick]], number[columns[self._pick]]
        self._diagonal = np.flatnonzero(column == row)
        indptr = np.searchsorted(column, np.arange(len(self.problem.free) + 1))
        self.factorizer = Factorizer(indptr, row)

    def prepare(self, t: float, T: Floats, dt: float, *, fresh: bool) -> None:
        """Have a factor of dH/dT + dt (K + slope) at hand, where dt is gamma times the step [s]."""
        key = float(f"{dt:.10e}")
        if (
            not fresh
            and self._factor is not None
            and self._key == key
            and (self.problem.linear or self.rate < REUSE_BELOW)
        ):
            return
        if self.problem.linear and (kept := self.factorizer.recall(key)) is not None:
            self._factor, self._key = kept, key
            return
        free = self.problem.free
        data = dt * self.problem.stiffness(t, T).data[self._pick]
        data[self._diagonal] += self.problem.capacity(T)[free] + dt * self.problem.loads(t, T).slope[free]
        self._factor = self.factorizer.factor(data, key if self.problem.linear else None)
        self._key, self.rate = key, 0.0

    def solve_conduction(self, T: Floats, residual: Floats) -> Floats:
        """Return the change of the free nodes that balances a heat flow of `residual` [W], (N,), without storage, K.

        Raises
        ------
        FactorFailed
            If nothing fixes the level of temperature in some part.
        """
        free = self.problem.free
        data = self.problem.stiffness(0.0, T).data[self._pick]
        data[self._diagonal] += self.problem.loads(0.0, T).slope[free]
        return self.factorizer.factor(data).solve(residual[free])

    def filter(self, residual: Floats) -> Floats:
        """Return the free nodes' temperature change that a heat of `residual` [J] in them, (n_free,), makes, K."""
        assert self._factor is not None  # noqa: S101 - prepare() has run
        return self._factor.solve(residual)

    def stage(self, t: float, dt: float, rhs: Floats, T: Floats) -> tuple[Floats, Floats, Loads, sp.csr_array] | None:
        """Solve H(T) - dt (loads - K T) = rhs on the free nodes; None when Newton fails."""
        problem = self.problem
        T = T.copy()
        T[problem.held] = problem.held_values(t)
        last = 0.0
        for _ in range(NEWTON_ROUNDS):
            K, loads = problem.stiffness(t, T), problem.loads(t, T)
            change = self.filter((rhs + dt * (loads.into - problem.conducted(K, T)) - problem.heat(T))[problem.free])
            T[problem.free] += change
            size = float(np.max(np.abs(change), initial=0.0))
            if size <= SURELY * self.tolerance:
                return T, problem.heat(T), problem.loads(t, T), K
            if not np.isfinite(size) or (last > 0.0 and size > 2.0 * last):
                return None
            if last > 0.0 and size < last:  # the first round tells nothing of how fast the error shrinks
                rate = size / last
                self.rate = max(self.rate, rate)
                if size * rate / (1.0 - rate) <= self.tolerance:
                    return T, problem.heat(T), problem.loads(t, T), K
            last = size
        return None


class March:
    """One march; iterate over it, then read `outcome`.

    Parameters
    ----------
    problem : Conduction
        The discrete problem.
    tolerance : float
        Local error allowed per step, K, as the largest over the nodes of the enthalpy error divided by the capacity at the start.
    steps : Steps, optional
        Replay these steps instead of choosing them.
    first : float
        Size of the first step after each jump of data, s (chosen steps only).
    """

    def __init__(
        self,
        problem: Conduction,
        *,
        tolerance: float,
        steps: Steps | None = None,
        first: float = 1.0,
        tableau: Tableau = SDIRK4,
    ) -> None:
        if problem.problem.begin is None or problem.problem.end is None:
            raise ValueError("a march needs a clock; solve a steady problem with fem.solve.steady")
        self.problem, self.tableau, self.tolerance = problem, tableau, tolerance
        self.outcome = Outcome.stopped
        self.begin, self.end = problem.problem.begin, problem.problem.end
        self._steps, self._first = steps, first
        self._solver = StageSolver(problem, NEWTON_PART * tolerance)
        self._linear = LinearStages(problem, tableau) if problem.linear else None
        self.T = problem.start()
        self._base = problem.capacity(self.T).copy()
        self._rate: Floats | None = None
        self._flow = np.zeros(len(problem.problem.faces))
        self.rejected = 0

    @property
    def factorizations(self) -> int:
        """Return how many numeric factorizations were done."""
        return self._solver.factorizer.count

    def __iter__(self) -> Iterator[Step]:
        """Yield accepted steps until the end, a failure, or until the caller stops."""
        return self._replay(self._steps) if self._steps is not None else self._choose()

    # --- the two ways to choose steps ------------------------------------------------------------------------------------------
    def _choose(self) -> Iterator[Step]:
        ladder = Ladder(self.begin, self.end, self.problem.problem.breaks(), self._first)
        impulse = self._enter(self.begin, jump=True)
        while not ladder.done:
            t0, t1 = ladder.now, ladder.next
            taken = self._try(t0, t1, estimate=True)
            if taken is None or taken[1] > self.tolerance:
                self.rejected += 1
                if not ladder.reject():
                    self.outcome = Outcome.newton_failed
                    return
                continue
            step, error = taken
            if not np.all(np.isfinite(step.T1)):
                self.outcome = Outcome.not_finite
                return
            yield self._advance(step, impulse)
            ladder.accept(grow=error * 1.2 * 2**self.tableau.order < self.tolerance)
            impulse = self._enter(t1, jump=ladder.breaks[t1]) if t1 in ladder.breaks else np.zeros(len(impulse))
        self.outcome = Outcome.finished

    def _replay(self, steps: Steps) -> Iterator[Step]:
        impulse = self._enter(float(steps.times[0]), jump=True)
        for t0, t1 in zip(steps.times[:-1].tolist(), steps.times[1:].tolist(), strict=True):
            pieces = [(t0, t1)]
            while pieces:
                a, b = pieces.pop()
                taken = self._try(a, b, estimate=False)
                if taken is None:
                    if b - a < SMALLEST_PIECE * (t1 - t0):
                        self.outcome = Outcome.newton_failed
                        return
                    pieces += [(0.5 * (a + b), b), (a, 0.5 * (a + b))]
                    continue
                if not np.all(np.isfinite(taken[0].T1)):
                    self.outcome = Outcome.not_finite
                    return
                yield self._advance(taken[0], impulse)
                impulse = np.zeros(len(impulse))
            if t1 in steps.breaks:
                impulse = self._enter(t1, jump=steps.breaks[t1])
        self.outcome = Outcome.finished

    # --- one step ---------------------------------------------------------------------------------------------------------------
    def _enter(self, t: float, *, jump: bool) -> Floats:
        """Cross a break: put held nodes on their values right after it, and find rates and flows there.

        Returns
        -------
        (n_faces,) float
            Heat that the held nodes take in at the jump itself, J.
        """
        problem = self.problem
        inside = t + INSIDE * 1e-3 * (self.end - self.begin)
        before = problem.heat(self.T)
        if jump:
            self.T = self.T.copy()
            self.T[problem.held] = problem.held_values(inside)
        loads = problem.loads(inside, self.T)
        through = loads.into - problem.conducted(problem.stiffness(inside, self.T), self.T)
        rate: Floats = through / problem.capacity(self.T)
        self._flow = loads.faces
        if len(problem.held):
            delta = 1e-6 * (self.end - self.begin)
            rate[problem.held] = (problem.held_values(inside + delta) - self.T[problem.held]) / delta
            at_held = problem.split_reaction((problem.capacity(self.T) * rate - through)[problem.held])
            self._flow = self._flow + (np.where(at_held == 0.0, 0.0, np.nan) if jump else at_held)
        self._rate = None if jump else rate
        return problem.split_reaction((problem.heat(self.T) - before)[problem.held])

    def _try(self, t0: float, t1: float, *, estimate: bool) -> tuple[Step, float] | None:
        try:
            for fresh in (False, True):
                self._solver.prepare(t0 + 0.25 * (t1 - t0), self.T, self.tableau.gamma * (t1 - t0), fresh=fresh)
                taken = self._stages(t0, t1, estimate=estimate)
                if taken is not None:
                    return taken
                if self.problem.linear:
                    break
        except FactorFailed:
            self._solver.rate = 1.0
        return None

    def _stages(self, t0: float, t1: float, *, estimate: bool) -> tuple[Step, float] | None:
        dt = t1 - t0
        if self._linear is not None:
            stages = self._linear.solve(t0, dt, self.T, self._solver.filter, estimate=estimate)
        elif (solved := self._newton_stages(t0, dt)) is not None:
            stages = solved
        else:
            return None
        problem, held, T = self.problem, self.problem.held, stages.T
        error = self._error(stages) if estimate else 0.0
        d1, flow = stages.rate, stages.outside
        if len(held):
            before = stages.t - 1e-4 * dt
            d1[held] = (T[held] - problem.held_values(before)) / (stages.t - before)
            flow = flow + problem.split_reaction(problem.capacity(T)[held] * d1[held] - stages.through)
        weights, nothing = dt * self.tableau.A[-1], np.zeros(len(flow))
        heat, made = weights @ stages.faces, weights @ stages.sources
        return Step(t0, t1, self.T, T, self._rate, d1, heat, nothing, made, nothing, flow), error

    def _newton_stages(self, t0: float, dt: float) -> Stages | None:
        problem, tableau, held = self.problem, self.tableau, self.problem.held
        s, size, T = len(tableau.c), tableau.gamma * dt, self.T
        F = np.zeros((s, problem.n))
        faces, sources = np.zeros((s, len(problem.problem.faces))), np.zeros((s, len(problem.problem.source)))
        before, through = problem.heat(T), np.empty(0)
        H = before
        for i, t in enumerate(tableau.instants(t0, dt)):
            rhs = before + dt * (tableau.A[i, :i] @ F[:i])
            # First guess: the rates of the stage before go on. It saves a fifth of Newton's rounds over starting from that stage.
            if i > 0:
                T = T + (rhs + size * F[i - 1] - H) / problem.capacity(T)
            elif self._rate is not None:
                T = T + size * self._rate
            solved = self._solver.stage(t, size, rhs, T)
            if solved is None:
                return None
            T, H, loads, K = solved
            F[i] = (H - rhs) / size
            faces[i], sources[i] = loads.faces, loads.sources
            if len(held):
                through = (loads.into - problem.conducted(K, T))[held]
                faces[i] += problem.split_reaction(F[i, held] - through)
        owed = dt * (tableau.error @ F)[problem.free]
        return Stages(t, T, F[-1] / problem.capacity(T), owed, faces, sources, loads.faces, through)

    def _error(self, stages: Stages) -> float:
        """Return the local error, K: the embedded difference, damped by the step matrix as Hairer and Wanner (II, IV.8) advise."""
        problem = self.problem
        change = self._solver.filter(stages.owed)
        weight = np.maximum(problem.capacity(stages.T)[problem.free] / self._base[problem.free], 1.0)
        return float(np.max(np.abs(change) * weight, initial=0.0))

    def _advance(self, step: Step, impulse: Floats) -> Step:
        self.T, self._rate = step.T1, step.d1
        taken = replace(step, impulse=impulse, flow0=self._flow)
        self._flow = step.flow
        return taken
