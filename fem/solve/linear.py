"""The stages of a step of a linear problem: one back-substitution each, and next to nothing besides.

With the balance matrix A (conduction and films) and the drive b(t) (flux, coefficient times ambient, source), the nodes' heat obeys
C dT/dt = b(t) - A T. Each stage is solved for the change since the step's start, so that rounding is that of the change.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.laws import Law
from fem.solve.conduction import Conduction
from fem.solve.stepping import Tableau

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
    rate : (N,) float
        Rate of change of each node that is not held in the last stage, K/s.
    owed : (n_free,) float
        Heat of the free nodes by which the embedded method differs, J; empty where nobody asked.
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
    rate: Floats
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
    """Heat into the nodes, W, that does not depend on their temperature.

    Parameters
    ----------
    problem : Conduction
    order : (N,) int
        In which the nodes are counted.

    Attributes
    ----------
    nodes : (n_driven,) int
        The nodes that are given any, in that order.
    """

    def __init__(self, problem: Conduction, order: Ints) -> None:
        self._problem, self._order = problem, order
        terms = list(_terms(problem))
        self._placed = any(term.law.needs & {"x", "y"} for term in terms)
        self._laws = [term.law for term in terms]
        place = np.argsort(order)
        all_nodes = place[np.concatenate([np.empty(0, dtype=np.intp), *(term.nodes for term in terms)])]
        self.nodes, node = np.unique(all_nodes, return_inverse=True)
        weight = np.concatenate([np.empty(0), *(term.weight for term in terms)])
        term_of = np.repeat(np.arange(len(terms)), [len(term.nodes) for term in terms])
        self._spread = sp.csr_array((weight, (node, term_of)), shape=(len(self.nodes), len(terms)))
        self._of_face = np.zeros((len(terms), len(problem.problem.faces)))
        self._of_region = np.zeros((len(terms), len(problem.problem.source)))
        for j, term in enumerate(terms):
            owner, row = (self._of_face, term.face) if term.face >= 0 else (self._of_region, term.region)
            owner[j, row] = term.weight.sum()

    def __call__(self, instants: list[float]) -> tuple[Floats, Floats, Floats]:
        """Return heat into `nodes` (s, n_driven), through faces (s, n_faces), made in regions (s, n_regions), W, at instants [s]."""
        if self._placed:
            cold = np.zeros(self._problem.n)
            loads = [self._problem.loads(t, cold) for t in instants]
            into = np.array([load.into for load in loads])[:, self._order[self.nodes]]
            return into, np.array([load.faces for load in loads]), np.array([load.sources for load in loads])
        values = np.array([[float(law(t=t)) for law in self._laws] for t in instants])
        return (self._spread @ values.T).T, values @ self._of_face, values @ self._of_region


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
        self._place = np.argsort(self._order)
        self._n = len(problem.free)
        cold = np.zeros(problem.n)
        self._capacity = problem.capacity(cold)[self._order]
        self._drive = Drive(problem, self._order)
        self._driven = int(np.searchsorted(self._drive.nodes, self._n))  # how many of them are free
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

    def solve(self, t0: float, dt: float, T: Floats, solve: Callable[[Floats], Floats], *, estimate: bool) -> Stages:
        """Return the stages of the step from t0 [s] of size dt [s] and temperatures T [K].

        Parameters
        ----------
        solve : callable
            From a heat of the free nodes [J] to their change [K], by the factor of C + gamma dt A.
        estimate : bool
            Whether to work out `owed`.
        """
        n, C, T = self._n, self._capacity, T.take(self._order)
        instants = self._tableau.instants(t0, dt)
        into, given, sources = self._drive(instants)
        leaving = self._balance @ T
        Z = np.empty((len(instants), len(T)))
        if n < len(T):
            Z[:, n:] = [self._problem.held_values(t) - T[n:] for t in instants]
        self._march(Z, dt, into, leaving, solve)

        outside = given - (Z[:, self._wet] + T[self._wet]) @ self._film.T
        faces, through = outside, np.empty(0)
        if n < len(T):
            net = -leaving[n:] - (self._rows @ Z[:, self._near].T).T
            net[:, self._drive.nodes[self._driven :] - n] += into[:, self._driven :]
            growth = C[n:] / dt * (self._back @ Z[:, n:])
            faces, through = outside + (growth - net) @ self._problem.held_parts.T, net[-1]
        owed = C[:n] * ((self._tableau.error @ self._back) @ Z[:, :n]) if estimate else np.empty(0)
        end, rate = (T + Z[-1]).take(self._place), ((self._back[-1] / dt) @ Z).take(self._place)
        return Stages(instants[-1], end, rate, owed, faces, sources, outside[-1], through)

    def _march(self, Z: Floats, dt: float, into: Floats, leaving: Floats, solve: Callable[[Floats], Floats]) -> None:
        """Fill in the free nodes' changes, Z[:, :n]; the held nodes' are given."""
        n, size, C = self._n, self._tableau.gamma * dt, self._capacity[: self._n]
        driven, heat = self._drive.nodes[: self._driven], size * into[:, : self._driven]
        moving = bool(Z[:, n:].any())
        lost = size * leaving[:n]
        for i in range(len(Z)):
            if i == 0:
                supply = -lost
            else:
                supply = (-self._tableau.gamma * self._back[i, :i]) @ Z[:i, :n]
                supply *= C
                supply -= lost
            supply[driven] += heat[i]
            if moving:
                supply -= size * (self._drawing @ Z[i, n:])
            Z[i, :n] = solve(supply)
