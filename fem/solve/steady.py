"""The steady state: Newton's method with a damped step. Noted as one step of one second, so that readers need no second form."""

import time

import numpy as np
from numpy.typing import NDArray

from fem.mesh.make import Mesh
from fem.results.history import History
from fem.solve.conduction import Conduction
from fem.solve.factor import FactorFailed
from fem.solve.march import Outcome, StageSolver, Step
from fem.solve.problem import Problem
from fem.solve.run import Gauges, Recorder, Run
from fem.solve.stepping import Steps

Floats = NDArray[np.float64]

ROUNDS = 300
"""The symmetric matrix leaves out dk/dT, so that convergence is linear where conductivity varies steeply: 85 rounds for a factor of 400."""
SHORTEST = 1.0 / 64.0
STILL = 1e-8
"""Part of the flows between nodes, taken from 0 K, below which nothing is said to flow: a ledger closes to 1e-6 of that."""


def solve_steady(mesh: Mesh, problem: Problem, gauges: Gauges, *, tolerance: float) -> Run:
    """Return the steady state as a run of one step from 0 s to 1 s; heats are flows times one second.

    Parameters
    ----------
    tolerance : float
        Newton stops when its last change is below this, K.
    """
    began = time.perf_counter()
    conduction = Conduction(mesh, problem)
    T, outcome, count = _newton(conduction, tolerance)
    recorder = Recorder(conduction, gauges)
    recorder.begin(T)
    loads = conduction.loads(0.0, T)
    flow = loads.faces + conduction.split_reaction(
        (conduction.conducted(conduction.stiffness(0.0, T), T) - loads.into)[conduction.held]
    )
    still = np.zeros(conduction.n)
    nothing = STILL * float((abs(conduction.stiffness(0.0, T)) @ np.abs(T)).sum())  # what rounding moves
    recorder.add(Step(0.0, 1.0, T, T, still, still, flow, 0.0 * flow, loads.sources, flow, flow))
    return Run(
        mesh, outcome, _flows_only(recorder.history()), Steps(np.array([0.0, 1.0])), np.array([1.0]), T[None, :], T, T, np.ones_like(T),
        recorder.heat, recorder.made, 0.0, nothing, T, time.perf_counter() - began, count,
    )  # fmt: skip


def _flows_only(history: History) -> History:
    keep = np.array([key.kind not in ("heat", "made", "stored") for key in history.keys])
    keys = tuple(key for key, kept in zip(history.keys, keep, strict=True) if kept)
    rows = (history.v0[keep], history.v1[keep], history.d0[keep], history.d1[keep])
    return History(keys, history.t0, history.t1, *rows)


def _newton(conduction: Conduction, tolerance: float) -> tuple[Floats, Outcome, int]:
    T = _guess(conduction)
    solver = StageSolver(conduction, tolerance)
    free = conduction.free
    for _ in range(ROUNDS):
        residual = _residual(conduction, T)
        try:
            change = solver.solve_conduction(T, residual)
        except FactorFailed:
            return T, Outcome.newton_failed, solver.factorizer.count
        if not np.all(np.isfinite(change)):
            return T, Outcome.not_finite, solver.factorizer.count
        part = 1.0 if conduction.linear else _part(conduction, T, change, residual)
        T = T.copy()
        T[free] += part * change
        if conduction.linear or part * float(np.max(np.abs(change), initial=0.0)) <= tolerance * part:
            return T, Outcome.finished, solver.factorizer.count
    return T, Outcome.newton_failed, solver.factorizer.count


def _residual(conduction: Conduction, T: Floats) -> Floats:
    return np.asarray(conduction.loads(0.0, T).into - conduction.conducted(conduction.stiffness(0.0, T), T))


def _part(conduction: Conduction, T: Floats, change: Floats, residual: Floats) -> float:
    """Return how much of the change to take: halved until the residual falls."""
    free = conduction.free
    size, part = float(np.linalg.norm(residual[free])), 1.0
    while part > SHORTEST:
        trial = T.copy()
        trial[free] += part * change
        if np.linalg.norm(_residual(conduction, trial)[free]) < size:
            break
        part *= 0.5
    return part


def _guess(conduction: Conduction) -> Floats:
    """Return a first state: the mean of what the faces offer, held nodes on their values."""
    offers: list[float] = []
    for face, share in zip(conduction.problem.faces, conduction.surfaces, strict=True):
        laws = [face.held] if face.held is not None else []
        laws += [film.ambient for film in face.films] + [radiant.surroundings for radiant in face.radiants]
        offers += [float(np.mean(law(t=0.0, x=share.x, y=share.y))) for law in laws if law is not None]
    T = np.full(conduction.n, np.mean(offers) if offers else 293.15)
    T[conduction.held] = conduction.held_values(0.0)
    return T
