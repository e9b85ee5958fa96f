"""The march against NGSolve on the same mesh, with the same lumping, tableau and steps, one thread each."""

import netgen.meshing as nm
import ngsolve as ng
import numpy as np

from fem.mesh.make import Mesh
from fem.solve.conduction import Conduction
from fem.solve.march import March
from fem.solve.problem import Problem
from fem.solve.stepping import SDIRK4
from tests.bench.quench import COLD, CORE, END, FILM, SLAB, ambient, equal_steps, mesh_near, posed
from tests.bench.rows import Row, cpu, ratio

SIZES = (20_000, 50_000)
STEPS = 40
ROUNDS = 5
AGREE = 1e-6
"""K by which the two may differ: both solve the same equations, so only by rounding. 1e-16 of 600 K, times the condition of the
step matrix (1e4 to 1e5 for these cells and steps), times one for each of some hundred substitutions, is below it."""


def ngsolve_mesh(mesh: Mesh) -> ng.Mesh:
    """Return our points, cells and facets as an NGSolve mesh: material r0, r1, ...; boundary c0, c1, ... by curve."""
    theirs = nm.Mesh(dim=2)
    theirs.AddPoints(np.column_stack((mesh.points, np.zeros(len(mesh.points)))))
    for r in range(len(mesh.plan.region_names)):
        theirs.Add(nm.FaceDescriptor(surfnr=r + 1, domin=r + 1, bc=r + 1))
        theirs.SetMaterial(r + 1, f"r{r}")
        theirs.AddElements(2, r + 1, mesh.cells[mesh.region == r].astype(np.int32), base=0)
    for c in range(len(mesh.plan.curves)):
        theirs.AddElements(1, c + 1, mesh.facets[mesh.curve == c].astype(np.int32), base=0)
        theirs.SetBCName(c, f"c{c}")
    return ng.Mesh(theirs)


def _boundary(problem: Problem, name: str) -> str:
    return "|".join(f"c{c}" for face in problem.faces if face.name == name for c in face.curves)


class TheirMarch:
    """M dT/dt = b(t) - A T with linear triangles lumped at the vertices."""

    def __init__(self, mesh: Mesh, problem: Problem) -> None:
        self.mesh = ngsolve_mesh(mesh)
        hot, cold = _boundary(problem, "hot air"), _boundary(problem, "cold plate")
        space = ng.H1(self.mesh, order=1, dirichlet=cold)
        u, v = space.TnT()
        stock = [SLAB, CORE]
        k = ng.CoefficientFunction([float(s.k_law()()) for s in stock])
        c = ng.CoefficientFunction([float(s.heat_capacity_law()()) for s in stock])
        cells = {ng.TRIG: ng.IntegrationRule([(0, 0), (1, 0), (0, 1)], [1 / 6] * 3)}
        ends = {ng.SEGM: ng.IntegrationRule([(0,), (1,)], [0.5, 0.5])}
        film = ng.ds(hot, intrules=ends)
        conduction = k * ng.grad(u) * ng.grad(v) * ng.dx + FILM * u * v * film
        self.A = ng.BilinearForm(conduction).Assemble().mat
        self.M = ng.BilinearForm(c * u * v * ng.dx(intrules=cells)).Assemble().mat
        self.g = ng.LinearForm(FILM * v * film).Assemble().vec
        self.space, self.T = space, ng.GridFunction(space)

    def march(self, steps: int) -> np.ndarray:
        """Return the nodal temperatures at the end, K, (N,)."""
        dt = END / steps
        A, c, size = SDIRK4.A, SDIRK4.c, SDIRK4.gamma * dt
        step = self.A.CreateMatrix()
        step.AsVector().data = self.M.AsVector() + size * self.A.AsVector()
        inverse = step.Inverse(self.space.FreeDofs(), inverse="sparsecholesky")
        T = self.T.vec
        T[:] = COLD
        k = [T.CreateVector() for _ in c]
        stage, rhs = T.CreateVector(), T.CreateVector()
        for n in range(steps):
            for i, part in enumerate(c.tolist()):
                stage.data = T
                for j in range(i):
                    stage.data += (dt * float(A[i, j])) * k[j]
                rhs.data = ambient((n + part) * dt) * self.g - self.A * stage
                k[i].data = inverse * rhs
            for j, weight in enumerate(A[-1].tolist()):
                T.data += (dt * weight) * k[j]
        return T.FV().NumPy().copy()


def rows() -> list[Row]:
    ng.ngsglobals.msg_level = 0
    ng.SetNumThreads(1)
    found = []
    for size in SIZES:
        job = posed()
        mesh = mesh_near(job, size)
        conduction, theirs = Conduction(mesh, job.problem), TheirMarch(mesh, job.problem)
        ends: dict[str, np.ndarray] = {}

        def ours(c: Conduction = conduction, ends: dict[str, np.ndarray] = ends) -> float:
            march = March(c, tolerance=0.1, steps=equal_steps(STEPS))
            return cpu(lambda: ends.update(ours=[step.T1 for step in march][-1]))

        def other(t: TheirMarch = theirs, ends: dict[str, np.ndarray] = ends) -> float:
            return cpu(lambda: ends.update(theirs=t.march(STEPS)))

        value, a, b = ratio(ours, other, ROUNDS)
        apart = float(np.max(np.abs(ends["ours"] - ends["theirs"])))
        case = f"{len(mesh.points)} unknowns, {STEPS} steps"
        found.append(Row("march / NGSolve", case, value, 0.7, f"{a:.2f} against {b:.2f} s of CPU"))
        found.append(Row("difference from NGSolve, K", case, apart, AGREE, "largest over the nodes at the end"))
    return found
