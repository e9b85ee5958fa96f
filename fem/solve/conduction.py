"""The discrete conduction problem: enthalpy, conduction, heat in. Evaluation only: no time loop, no files.

Form: d/dt sum_r V_ir H_r(T_i) = -(K(T, t) T)_i + loads_i(t, T), with lumped linear triangles. Lumping keeps every temperature of a
quench between its data (no over- or undershoot) and makes heat-in through each face exact in the discrete balance.
"""

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.laws import Law
from fem.mesh.make import Mesh
from fem.solve.assembly import Assembly, Share
from fem.solve.enthalpy import ZERO, enthalpy
from fem.solve.problem import Face, Problem

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(frozen=True)
class Loads:
    """Heat that enters the nodes at one instant.

    Attributes
    ----------
    into : (N,) float
        W (per metre when planar).
    slope : (N,) float
        Minus its derivative by the node's own temperature, W/K, not negative.
    faces : (n_faces,) float
        Heat in through each face that is not held, W; zero for held ones.
    sources : (n_regions,) float
        Heat made in each region, W.
    """

    into: Floats
    slope: Floats
    faces: Floats
    sources: Floats


def _at(law: Law, t: float, share: Share, T: Floats) -> Floats | float:
    """Evaluate a law on the nodes of a share; constants and schedules stay scalars."""
    value = law(t=t, x=share.x, y=share.y, T=T)
    return float(value) if np.ndim(value) == 0 else np.asarray(value, dtype=np.float64)


def _slope(law: Law, t: float, share: Share, T: Floats) -> Floats | float:
    """Central difference of a law by temperature; used in the Newton matrix only, so it moves no answer."""
    if "T" not in law.needs:
        return 0.0
    step = 1e-3
    return (_at(law, t, share, T + step) - _at(law, t, share, T - step)) / (2.0 * step)


class Conduction:
    """One problem on one mesh.

    Attributes
    ----------
    n : int
        Number of nodes.
    held : (n_held,) int
        Nodes whose temperature is given.
    free : (n_free,) int
        The others.
    held_parts : (n_faces, n_held) float
        The part of each held node that belongs to each held face.
    linear : bool
        True when no coefficient depends on temperature and no conduction or film coefficient on time, so that a step needs one solve.
    """

    def __init__(self, mesh: Mesh, problem: Problem) -> None:
        self.mesh, self.problem = mesh, problem
        self.parts = Assembly(mesh, revolution=problem.revolution)
        self.n = self.parts.n
        self.enthalpies = tuple(enthalpy(law) for law in problem.heat_capacity)
        self.surfaces = tuple(self.parts.surface(face.curves) for face in problem.faces)
        self.cells_of = tuple(np.flatnonzero(mesh.region == r) for r in range(len(problem.conductivity)))
        self.centres = mesh.points[mesh.cells].mean(axis=1)
        self._find_held()
        self.linear = self._is_linear()
        self._stiffness = self._assemble(0.0, np.zeros(self.n)) if self._fixed_conductivity() else None
        self._capacity: Floats | None = None
        if all("T" not in law.needs for law in problem.heat_capacity):
            self._capacity = self.capacity(np.zeros(self.n))

    def _find_held(self) -> None:
        self.held_faces = tuple(i for i, face in enumerate(self.problem.faces) if face.held is not None)
        surface, count = np.zeros(self.n), np.zeros(self.n)
        for i in self.held_faces:
            surface[self.surfaces[i].nodes] += self.surfaces[i].size
            count[self.surfaces[i].nodes] += 1.0
        # The part of each held node that belongs to each held face; nodes on the axis have no surface and are shared evenly.
        self.held, self.free = np.flatnonzero(count > 0.0), np.flatnonzero(count == 0.0)
        self.held_parts = np.zeros((len(self.problem.faces), len(self.held)))
        self._held_at = {i: np.searchsorted(self.held, self.surfaces[i].nodes) for i in self.held_faces}
        for i in self.held_faces:
            nodes, size = self.surfaces[i].nodes, self.surfaces[i].size
            total = surface[nodes]
            part = np.where(total > 0.0, size / np.where(total > 0.0, total, 1.0), 1.0 / count[nodes])
            self.held_parts[i, self._held_at[i]] = part
        laws = [face.held for face in self.problem.faces if face.held is not None]
        self._still: Floats | None = None  # the held nodes' temperatures where none varies in time
        if all("t" not in law.needs for law in laws):
            self._still = self.held_values(0.0)

    def _fixed_conductivity(self) -> bool:
        return all(not (law.needs & {"T", "t"}) for law in self.problem.conductivity)

    def _is_linear(self) -> bool:
        fixed = self._fixed_conductivity() and all("T" not in law.needs for law in self.problem.heat_capacity)
        mild = all(law is None or "T" not in law.needs for law in self.problem.source)
        return fixed and mild and all(_is_linear(face) for face in self.problem.faces)

    # --- what is stored -------------------------------------------------------------------------------------------------------
    def heat(self, T: Floats) -> Floats:
        """Return the nodes' enthalpy, J (per metre when planar), shape (N,)."""
        if self._capacity is not None:
            return self._capacity * (T - ZERO)
        H = np.zeros(self.n)
        for share, rule in zip(self.parts.volumes, self.enthalpies, strict=True):
            H[share.nodes] += share.size * rule.heat(T[share.nodes], share.x, share.y)
        return H

    def capacity(self, T: Floats) -> Floats:
        """Return the derivative of `heat` by each node's own temperature, J/K, shape (N,)."""
        if self._capacity is not None:
            return self._capacity
        C = np.zeros(self.n)
        for share, rule in zip(self.parts.volumes, self.enthalpies, strict=True):
            C[share.nodes] += share.size * rule.slope(T[share.nodes], share.x, share.y)
        return C

    # --- what flows -----------------------------------------------------------------------------------------------------------
    def stiffness(self, t: float, T: Floats) -> sp.csr_array:
        """Return the conduction matrix at time t [s] and nodal temperatures T [K], W/K, shape (N, N)."""
        return self._stiffness if self._stiffness is not None else self._assemble(t, T)

    @staticmethod
    def conducted(K: sp.csr_array, T: Floats) -> Floats:
        """Return K T, the heat that conduction takes from each node, W, (N,).

        The rows of K sum to zero, so the level of T may be taken off first: what is lost to rounding is then a part of the differences
        within the section, not of the temperature itself (a factor 1e5 in a thin plate of copper).
        """
        return np.asarray(K @ (T - T.mean()))

    def _assemble(self, t: float, T: Floats) -> sp.csr_array:
        k = np.empty(len(self.mesh.cells))
        mean = T[self.mesh.cells].mean(axis=1)
        for law, cells in zip(self.problem.conductivity, self.cells_of, strict=True):
            k[cells] = law(t=t, x=self.centres[cells, 0], y=self.centres[cells, 1], T=mean[cells])
        return self.parts.stiffness(k)

    def loads(self, t: float, T: Floats) -> Loads:
        """Return the heat entering every node at time t [s] and nodal temperatures T [K], held faces left out."""
        into, slope = np.zeros(self.n), np.zeros(self.n)
        faces = np.zeros(len(self.problem.faces))
        for i, (face, share) in enumerate(zip(self.problem.faces, self.surfaces, strict=True)):
            if face.held is not None:
                continue
            q, dq = self._density(face, share, t, T[share.nodes])
            heat = share.size * q
            into[share.nodes] += heat
            slope[share.nodes] += share.size * dq
            faces[i] = heat.sum()
        sources = np.zeros(len(self.problem.source))
        for r, (law, share) in enumerate(zip(self.problem.source, self.parts.volumes, strict=True)):
            if law is None:
                continue
            Tn = T[share.nodes]
            heat = share.size * _at(law, t, share, Tn)
            into[share.nodes] += heat
            slope[share.nodes] += share.size * np.maximum(-_slope(law, t, share, Tn), 0.0)
            sources[r] = heat.sum()
        return Loads(into, slope, faces, sources)

    def film_coefficients(self) -> sp.csr_array:
        """Return each face's film coefficient times surface at each node, W/K, (n_faces, N), where it depends on place only."""
        rows, columns, values = [], [], []
        for i, (face, share) in enumerate(zip(self.problem.faces, self.surfaces, strict=True)):
            for film in face.films:
                rows.append(np.full(len(share.nodes), i))
                columns.append(share.nodes)
                values.append(share.size * film.coefficient(x=share.x, y=share.y))
        empty = [np.empty(0)]
        where = np.concatenate(empty + rows).astype(np.intp), np.concatenate(empty + columns).astype(np.intp)
        return sp.csr_array((np.concatenate(empty + values), where), shape=(len(self.problem.faces), self.n))

    @staticmethod
    def _density(face: Face, share: Share, t: float, T: Floats) -> tuple[Floats, Floats]:
        """Return the heat flux into the section, W/m2, and minus its derivative by temperature, where that is positive."""
        q, dq = np.zeros(len(T)), np.zeros(len(T))
        for flux in face.fluxes:
            q += _at(flux, t, share, T)
            dq -= _slope(flux, t, share, T)
        for film in face.films:
            h, drive = _at(film.coefficient, t, share, T), _at(film.ambient, t, share, T) - T
            q += h * drive
            dq += h - _slope(film.coefficient, t, share, T) * drive
        for radiant in face.radiants:
            e = _at(radiant.emissivity, t, share, T) * radiant.sigma
            q += e * (_at(radiant.surroundings, t, share, T) ** 4 - T**4)
            dq += 4.0 * e * np.abs(T) ** 3
        return q, np.maximum(dq, 0.0)

    # --- what is held ---------------------------------------------------------------------------------------------------------
    def held_values(self, t: float) -> Floats:
        """Return the held nodes' temperatures at t [s], K, shape (n_held,); a node of two held faces takes their weighted mean."""
        if self._still is not None:
            return self._still
        total = np.zeros(len(self.held))
        for i in self.held_faces:
            share, law, at = self.surfaces[i], self.problem.faces[i].held, self._held_at[i]
            assert law is not None  # noqa: S101 - held_faces lists only faces with one
            total[at] += self.held_parts[i, at] * _at(law, t, share, np.zeros(len(at)))
        return total

    def split_reaction(self, reaction: Floats) -> Floats:
        """Share the heat that the held nodes take in, (n_held,) W, among the faces, (n_faces,) W.

        At a corner of two held faces the split is by the lumped surface of each: the sum is exact, the split is a convention.
        """
        return self.held_parts @ reaction

    def start(self) -> Floats:
        """Return the nodal start temperatures, K, shape (N,).

        On a node between regions that start at different temperatures the heat of both is kept: the node takes the temperature
        at which its own enthalpy is the sum of its parts (plain averaging was measured 0.57 K wrong).
        """
        volume, T = np.zeros(self.n), np.zeros(self.n)
        heat = np.zeros(self.n)
        for share, law, rule in zip(self.parts.volumes, self.problem.start, self.enthalpies, strict=True):
            mine = np.broadcast_to(_at(law, 0.0, share, np.zeros(len(share.nodes))), share.nodes.shape).astype(
                np.float64
            )
            volume[share.nodes] += share.size
            T[share.nodes] += share.size * mine
            heat[share.nodes] += share.size * rule.heat(mine, share.x, share.y)
        T /= volume
        for _ in range(30):
            change = (heat - self.heat(T)) / self.capacity(T)
            T += change
            if np.max(np.abs(change)) < 1e-10 * np.max(np.abs(T)):
                break
        return T


def _is_linear(face: Face) -> bool:
    films = all(not (film.coefficient.needs & {"T", "t"}) for film in face.films)
    return films and not face.radiants and all("T" not in flux.needs for flux in face.fluxes)
