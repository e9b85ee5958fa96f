"""The stages of a step of a linear problem: one back-substitution each, and next to nothing besides.

With the balance matrix A (conduction and films) and the drive b(t) (flux, coefficient times ambient, source), the nodes' heat obeys
C dT/dt = b(t) - A T. Each stage is solved for the change since the step's start, so that rounding is that of the change.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.conduction import Conduction
from fem.laws import Law
from fem.stepping import Tableau

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(frozen=True)
class Stages:
    """The solved stages of one step.

    Attributes
    ----------
    t : float
        Time of the last stage, s.
    T : (N,) float
        Temperatures at the step's end, K.
    growth : (N,) float
        Rate at which each node's heat grows in the last stage, W.
    owed : (n_free,) float
        Heat of the free nodes by which the embedded method differs, J.
    faces : (s, n_faces) float
        Heat flow in through each face, W.
    sources : (s, n_regions) float
        Heat made in each region, W.
    outside : (n_faces,) float
        The last row of `faces` without the held faces, W.
    through : (n_held,) float
        Heat that flows to the held nodes from the section and from faces that are not held, in the last stage, W.
    """

    t: float
    T: Floats
    growth: Floats
    owed: Floats
    faces: Floats
    sources: Floats
    outside: Floats
    through: Floats


@dataclass(frozen=True)
class _Term:
    """A law of time, and how much of it enters each of some nodes, through which face or in which region."""

    law: Law
    nodes: Ints
    weight: Floats
    face: int = -1
    region: int = -1


def _terms(problem: Conduction) -> Iterator[_Term]:
    for i, (face, share) in enumerate(zip(problem.problem.faces, problem.surfaces, strict=True)):
        if face.held is not None:
            continue
        for flux in face.fluxes:
            yield _Term(flux, share.nodes, share.size, face=i)
        for film in face.films:
            yield _Term(film.ambient, share.nodes, share.size * film.coefficient(x=share.x, y=share.y), face=i)
    for r, (law, share) in enumerate(zip(problem.problem.source, problem.parts.volumes, strict=True)):
        if law is not None:
            yield _Term(law, share.nodes, share.size, region=r)


class Drive:
    """Heat into the nodes, W, that does not depend on their temperature, at one instant.

    Parameters
    ----------
    problem : Conduction
    order : (N,) int
        In which the nodes are given back.
    """

    def __init__(self, problem: Conduction, order: Ints) -> None:
        self._problem, self._order = problem, order
        terms = list(_terms(problem))
        self._placed = any(term.law.needs & {"x", "y"} for term in terms)
        self._laws = [term.law for term in terms]
        nodes = np.concatenate([np.empty(0, dtype=np.intp), *(term.nodes for term in terms)])
        weight = np.concatenate([np.empty(0), *(term.weight for term in terms)])
        column = np.repeat(np.arange(len(terms)), [len(term.nodes) for term in terms])
        self._spread = sp.csc_array((weight, (np.argsort(order)[nodes], column)), shape=(problem.n, len(terms)))
        self._of_face = np.zeros((len(problem.problem.faces), len(terms)))
        self._of_region = np.zeros((len(problem.problem.source), len(terms)))
        for j, term in enumerate(terms):
            owner, row = (self._of_face, term.face) if term.face >= 0 else (self._of_region, term.region)
            owner[row, j] = term.weight.sum()
        self._last: tuple[list[float], tuple[Floats, Floats, Floats]] | None = None

    def __call__(self, t: float) -> tuple[Floats, Floats, Floats]:
        """Return heat into the nodes (N,), through the faces (n_faces,) and made in the regions (n_regions,), W, at t [s]."""
        if self._placed:
            loads = self._problem.loads(t, np.zeros(self._problem.n))
            return loads.into[self._order], loads.faces, loads.sources
        values = [float(law(t=t)) for law in self._laws]
        if self._last is None or self._last[0] != values:
            now = np.array(values)
            self._last = (values, (self._spread @ now, self._of_face @ now, self._of_region @ now))
        return self._last[1]


class LinearStages:
    """Solves the stages of steps of one linear problem.

    The stages' changes Z since the step's start obey C Z = dt A F with F the rates of heat, so the rates are C A^-1 Z / dt and need
    not be kept (Hairer and Wanner, Solving Ordinary Differential Equations II, 2nd ed., IV.8). Inside, the free nodes come first
    and the held ones last, so that each are one block; what only some nodes take part in is done for all stages at once, since
    small products cost more in calls than in arithmetic.
    """

    def __init__(self, problem: Conduction, tableau: Tableau) -> None:
        self._problem, self._tableau = problem, tableau
        self._back = np.linalg.inv(tableau.A)  # from changes to rates, over C / dt
        self._order = np.concatenate((problem.free, problem.held))
        self._n = len(problem.free)
        cold = np.zeros(problem.n)
        self._capacity = problem.capacity(cold)[self._order]
        self._drive = Drive(problem, self._order)
        film = problem.film_coefficients()
        balance = problem.stiffness(0.0, cold) + sp.diags_array(film.sum(axis=0))
        self._balance = sp.csr_array(balance[self._order][:, self._order])
        film = film[:, self._order]
        self._wet = np.unique(film.indices)
        self._film = film[:, self._wet].toarray()
        rows = self._balance[self._n :]
        self._near = np.unique(rows.indices)
        self._rows = sp.csr_array(rows[:, self._near])
        self._drawing = sp.csc_array(rows[:, : self._n].T)

    def solve(self, t0: float, dt: float, T: Floats, solve: Callable[[Floats], Floats]) -> Stages:
        """Return the stages of the step from t0 [s] of size dt [s] and temperatures T [K].

        Parameters
        ----------
        solve : callable
            From a heat of the free nodes [J] to their change [K], by the factor of C + gamma dt A.
        """
        n, C, T = self._n, self._capacity, T[self._order]
        instants = self._tableau.instants(t0, dt)
        drives = [self._drive(t) for t in instants]
        into = [drive[0] for drive in drives]
        leaving = self._balance @ T
        Z = np.empty((len(instants), len(T)))
        if n < len(T):
            Z[:, n:] = [self._problem.held_values(t) - T[n:] for t in instants]
        self._march(Z, dt, into, leaving, solve)

        outside = np.array([drive[1] for drive in drives]) - (Z[:, self._wet] + T[self._wet]) @ self._film.T
        faces, through = outside, np.empty(0)
        if n < len(T):
            net = np.array([given[n:] for given in into]) - leaving[n:] - (self._rows @ Z[:, self._near].T).T
            growth = C[n:] / dt * (self._back @ Z[:, n:])
            faces, through = outside + (growth - net) @ self._problem.held_parts.T, net[-1]
        owed = C[:n] * ((self._tableau.error @ self._back) @ Z[:, :n])
        sources = np.array([drive[2] for drive in drives])
        end, growth = np.empty(len(T)), np.empty(len(T))
        end[self._order], growth[self._order] = T + Z[-1], C / dt * (self._back[-1] @ Z)
        return Stages(instants[-1], end, growth, owed, faces, sources, outside[-1], through)

    def _march(
        self, Z: Floats, dt: float, into: list[Floats], leaving: Floats, solve: Callable[[Floats], Floats]
    ) -> None:
        """Fill in the free nodes' changes, Z[:, :n]; the held nodes' are given."""
        n, size, last = self._n, self._tableau.gamma * dt, None
        moving = bool(Z[:, n:].any())
        for i in range(len(Z)):
            if into[i] is not last:
                last, steady = into[i], size * (into[i] - leaving)[:n]
            supply = (-self._tableau.gamma * self._back[i, :i]) @ Z[:i, :n]
            supply *= self._capacity[:n]
            supply += steady
            if moving:
                supply -= size * (self._drawing @ Z[i, n:])
            Z[i, :n] = solve(supply)
