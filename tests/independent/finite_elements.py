"""The same job by NGSolve: its own mesh, elements of higher order, consistent mass, implicit Euler with Richardson extrapolation.

Extrapolating one step against two halves is second order and damps stiff parts (Hairer and Wanner, Solving Ordinary Differential
Equations II, IV.9). Temperatures are in degC.
"""

from collections.abc import Callable
from itertools import pairwise

import netgen.occ as occ
import ngsolve as ng
import numpy as np

from tests.independent.job import Job

SIGMA = 5.670374419e-8  # W/(m2 K4), CODATA 2018
ZERO = 273.15  # K
NEWTON = 1e-5  # K, of changes that shrink by ten and more a round
ROUNDS = 12


def mesh_of(job: Job, size: Callable[[str], float]) -> ng.Mesh:
    """Return a mesh whose materials are r0, r1, ... and whose outer edges are named e0, e1, ... by the exposure on them."""
    faces: list[occ.Face] = []
    for i, region in enumerate(job.regions):
        points = region["points"]
        pen = occ.WorkPlane().MoveTo(*points[0])
        for x, y in points[1:]:
            pen = pen.LineTo(x, y)
        face = pen.Close().Face()
        faces = [older - face for older in faces]  # later regions cut earlier ones
        face.faces.name, face.faces.maxh = f"r{i}", size(region["name"])
        faces.append(face)
    for i, face in enumerate(faces):
        face.faces.name, face.faces.maxh = f"r{i}", size(job.regions[i]["name"])
    shape = occ.Glue(faces)
    for edge in shape.edges:
        middle, along = edge.center, edge.end - edge.start
        edge.name = _facing(job, middle) if _outer(job, (middle.x, middle.y), (along.x, along.y)) else "inner"
    return ng.Mesh(occ.OCCGeometry(shape, dim=2).GenerateMesh(maxh=1.0, grading=0.3))


def _facing(job: Job, at: occ.Pnt) -> str:
    for e, exposure in enumerate(job.exposures):
        for place in exposure.on:
            name, _, edge = place.partition(".")
            region = next(r for r in job.regions if r["name"] == name)
            ends = zip(region["points"], region["points"][1:] + region["points"][:1], region["edges"], strict=True)
            for (x0, y0), (x1, y1), own in ends:
                if edge in (own, "*") and _on((at.x, at.y), (x0, y0), (x1, y1)):
                    return f"e{e}"
    return "insulated"


def _outer(job: Job, middle: tuple[float, float], along: tuple[float, float]) -> bool:
    """Return whether one side of an edge is outside every region: an interface is no place for an exposure."""
    nudge = 1e-6 / np.hypot(*along)
    sides = [(middle[0] - s * nudge * along[1], middle[1] + s * nudge * along[0]) for s in (1.0, -1.0)]
    return not all(any(_within(side, region["points"]) for region in job.regions) for side in sides)


def _within(p: tuple[float, float], outline: list[tuple[float, float]]) -> bool:
    """Even-odd rule."""
    inside = False
    for (x0, y0), (x1, y1) in zip(outline, outline[1:] + outline[:1], strict=True):
        if (y0 > p[1]) != (y1 > p[1]) and p[0] < x0 + (p[1] - y0) * (x1 - x0) / (y1 - y0):
            inside = not inside
    return inside


def _on(p: tuple[float, float], a: tuple[float, float], b: tuple[float, float]) -> bool:
    length = np.hypot(b[0] - a[0], b[1] - a[1])
    return bool(abs(np.hypot(p[0] - a[0], p[1] - a[1]) + np.hypot(p[0] - b[0], p[1] - b[1]) - length) < 1e-9)


def _table(rows: list[tuple[float, float]], T: ng.CoefficientFunction) -> ng.CoefficientFunction:
    """Return a table over temperature as a function of T, straight between its rows, its end values beyond its ends."""
    return ng.CoefficientFunction(rows[0][1]) if len(rows) == 1 else _straight(rows)(T)


def _straight(rows: list[tuple[float, float]]) -> ng.BSpline:
    x = [-1000.0, *(a for a, _ in rows), 5000.0]
    y = [rows[0][1], *(b for _, b in rows), rows[-1][1]]
    return ng.BSpline(2, [x[0], *x, x[-1]], y)


def _stored(rows: list[tuple[float, float]], T: ng.CoefficientFunction) -> ng.CoefficientFunction:
    """Return the integral of a table over temperature."""
    return rows[0][1] * T if len(rows) == 1 else _straight(rows).Integrate()(T)


class Run:
    """One run on one mesh."""

    def __init__(self, job: Job, mesh: ng.Mesh, *, order: int = 2) -> None:
        self.job, self.mesh = job, mesh
        held = "|".join(f"e{i}" for i, e in enumerate(job.exposures) if e.held is not None)
        self.space = ng.H1(mesh, order=order, dirichlet=held)
        self.T, self.old = ng.GridFunction(self.space), ng.GridFunction(self.space)
        self.dt = ng.Parameter(1.0)
        self.values = [
            {name: ng.Parameter(0.0) for name in ("held", "ambient", "surroundings", "flux")} for _ in job.exposures
        ]
        self._forms()
        self._kept: dict[float, ng.BaseMatrix] = {}

    def _forms(self) -> None:
        u, v = self.space.TnT()
        by_region = range(len(self.job.stocks))
        k, c = self._property("conductivity", self.old), self._property("specific_heat", self.old)
        rho = ng.CoefficientFunction([s["density"][0][1] for s in self.job.stocks])
        stored = ng.CoefficientFunction([_stored(self.job.stocks[r]["specific_heat"], u) for r in by_region])
        before = ng.CoefficientFunction([_stored(self.job.stocks[r]["specific_heat"], self.old) for r in by_region])
        k_now = ng.CoefficientFunction([_table(self.job.stocks[r]["conductivity"], u) for r in by_region])
        self.residual = ng.BilinearForm(self.space, nonassemble=True)
        self.residual += (rho * (stored - before) * v + self.dt * k_now * ng.grad(u) * ng.grad(v)) * ng.dx
        self.slope = ng.BilinearForm(self.space, symmetric=True)
        self.slope += (rho * c * u * v + self.dt * k * ng.grad(u) * ng.grad(v)) * ng.dx
        for i, (exposure, value) in enumerate(zip(self.job.exposures, self.values, strict=True)):
            h, e = exposure.coefficient, exposure.emissivity * SIGMA
            q = h * (value["ambient"] - u) + e * ((value["surroundings"] + ZERO) ** 4 - (u + ZERO) ** 4) + value["flux"]
            there = ng.ds(f"e{i}", bonus_intorder=6)
            self.residual += -self.dt * q * v * there
            self.slope += self.dt * (h + 4 * e * (self.old + ZERO) ** 3) * u * v * there

    def _property(self, name: str, T: ng.GridFunction) -> ng.CoefficientFunction:
        return ng.CoefficientFunction([_table(stock[name], T) for stock in self.job.stocks])

    def start(self) -> None:
        """Put the start into T so that each region's heat is kept."""
        u, v = self.space.TnT()
        start = ng.CoefficientFunction([float(s) for s in self.job.starts])
        rho = ng.CoefficientFunction([s["density"][0][1] for s in self.job.stocks])
        weight = rho * ng.CoefficientFunction([_table(stock["specific_heat"], start) for stock in self.job.stocks])
        mass = ng.BilinearForm(weight * u * v * ng.dx).Assemble()
        load = ng.LinearForm(weight * start * v * ng.dx).Assemble()
        self.T.vec.data = mass.mat.Inverse(inverse="sparsecholesky") * load.vec

    def euler(self, t: float, dt: float) -> None:
        """Go one implicit Euler step from t to t + dt, s."""
        self.old.vec.data = self.T.vec
        self.dt.Set(dt)
        for exposure, value in zip(self.job.exposures, self.values, strict=True):
            for name, parameter in value.items():
                schedule = getattr(exposure, name)
                if schedule is not None:
                    parameter.Set(schedule(t + dt))
        for i, exposure in enumerate(self.job.exposures):
            if exposure.held is not None:
                self.T.Set(exposure.held(t + dt), definedon=self.mesh.Boundaries(f"e{i}"))
                held = self.T.vec.CreateVector()
                held.data = self.old.vec
                for dof in np.flatnonzero(~np.array(self.space.FreeDofs())):
                    held[int(dof)] = self.T.vec[int(dof)]
                self.T.vec.data = held
        wrong, change = self.T.vec.CreateVector(), self.T.vec.CreateVector()
        for fresh in (False, True):
            inverse = self._inverse(dt, fresh=fresh)
            for _ in range(ROUNDS):
                self.residual.Apply(self.T.vec, wrong)
                change.data = inverse * wrong
                self.T.vec.data -= change
                if np.max(np.abs(change.FV().NumPy())) < NEWTON:
                    return
        raise ArithmeticError("the modified Newton iteration does not converge: take smaller steps")

    def _inverse(self, dt: float, *, fresh: bool) -> ng.BaseMatrix:
        """Return the inverse of the slope for a step of dt, s, of an earlier step where it is not to be fresh."""
        key = round(dt, 9)
        if fresh or key not in self._kept:
            self.slope.Assemble()
            self._kept[key] = self.slope.mat.Inverse(self.space.FreeDofs(), inverse="sparsecholesky")
        return self._kept[key]

    def step(self, t: float, dt: float) -> None:
        """Go one extrapolated step."""
        begin, once = self.T.vec.CreateVector(), self.T.vec.CreateVector()
        begin.data = self.T.vec
        self.euler(t, dt)
        once.data = self.T.vec
        self.T.vec.data = begin
        self.euler(t, 0.5 * dt)
        self.euler(t + 0.5 * dt, 0.5 * dt)
        self.T.vec.data = 2.0 * self.T.vec - once

    def march(self, parts: int) -> np.ndarray:
        """Return the gauges' temperatures at the reporting times after the begin, degC, (n_gauges, n_times).

        Each reporting interval, on whose ends every kink of the logs lies, is split into `parts` equal steps; the first of all
        these, which holds the jump of the start, into 4 `parts` steps that grow evenly from a thousandth of it.
        """
        job = self.job
        self.start()
        places = [self.mesh(x, y) for x, y in job.gauges.values()]
        rows, count = [], round((job.end - job.begin) / job.every)
        for n in range(count):
            ends = np.linspace(0.0, 1.0, parts + 1)
            if n == 0:
                ends = np.unique(np.concatenate((ends, ends[1] * np.geomspace(1e-3, 1.0, 4 * parts))))
            for a, b in pairwise(ends.tolist()):
                self.step(job.begin + (n + a) * job.every, (b - a) * job.every)
            rows.append([self.T(place) for place in places])
        return np.array(rows).T
