"""Random small problems for the property tests: hypothesis draws numbers, these turn them into something to solve."""

from dataclasses import dataclass, replace

import numpy as np
from hypothesis import HealthCheck, Phase, settings
from hypothesis import strategies as st

from fem.mesh.data import Mesh
from fem.solve.march import Outcome
from fem.solve.problem import Problem
from fem.solve.run import run
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import box_plan, face, grid_mesh, problem_on

FEW = settings(
    max_examples=6,
    deadline=None,
    derandomize=True,
    database=None,
    phases=(Phase.explicit, Phase.generate),
    suppress_health_check=list(HealthCheck),
)
"""Few examples, the same each time: the suite must be quick, and a failure must come back."""

UNIT = st.floats(0.0, 1.0)


@dataclass(frozen=True)
class Job:
    """A two-part bar with a film, a flux and a held edge, all of constant properties unless `curved`.

    Attributes
    ----------
    k, rho_c : pair of float
    h, ambient, flux, held, source, start : float
    curved : bool
        Properties over temperature, and radiation.
    """

    k: tuple[float, float] = (1.0, 3.0)
    rho_c: tuple[float, float] = (1.0, 2.0)
    h: float = 2.0
    ambient: float = 400.0
    flux: float = 20.0
    held: float = 350.0
    source: float = 10.0
    start: float = 300.0
    curved: bool = False


def jobs(curved=None):
    """Return a strategy of jobs."""
    return st.builds(
        Job,
        k=st.tuples(st.floats(0.3, 5.0), st.floats(0.3, 5.0)),
        rho_c=st.tuples(st.floats(0.5, 3.0), st.floats(0.5, 3.0)),
        h=st.floats(0.1, 20.0),
        ambient=st.floats(250.0, 1200.0),
        flux=st.floats(-50.0, 200.0),
        held=st.floats(250.0, 900.0),
        source=st.floats(0.0, 100.0),
        start=st.floats(250.0, 900.0),
        curved=st.booleans() if curved is None else st.just(curved),
    )


def bar(columns=6, rows=3, kind="planar"):
    """Return a mesh of two parts, 1 m long and 0.3 m high."""
    x = np.linspace(0.0, 1.0, 2 * columns + 1) ** 1.1  # not the same everywhere
    x[columns] = 0.5
    x.sort()
    return grid_mesh(
        box_plan((0.0, 0.5, 1.0), 0.3, kind),
        x,
        np.linspace(0.0, 0.3, rows + 1),
        lambda c, _: (c > 0.5).astype(int),
        alternate=True,
    )


def _rising(a):
    return lambda T: a * (1 + T / 2000)


def _curved(a):
    return lambda T: a * (1 + (T / 1500) ** 2)


def posed(job: Job, plan, end=0.4) -> Problem:
    """Return the job's problem: film on the right, flux on top of part 1, held on the left, radiation below part 0 if curved."""
    faces = [
        face(plan, "part 1.right", film=(job.h, lambda t: job.ambient * (1 - 0.1 * np.cos(9 * t)))),
        face(plan, "part 1.top", flux=job.flux),
        face(plan, "part 0.left", held=lambda t: job.held + 10 * t),
    ]
    k, rho_c = job.k, job.rho_c
    if job.curved:
        faces.append(face(plan, "part 0.bottom", radiant=(0.02, job.ambient)))
        k, rho_c = tuple(map(_rising, k)), tuple(map(_curved, rho_c))
    return problem_on(plan, faces, k=k, rho_c=rho_c, source=(None, job.source), start=job.start, end=end)


def solved(mesh: Mesh, problem: Problem, count=12, points=()):
    """Return a run of equal steps."""
    steps = Steps(np.linspace(problem.begin, problem.end, count + 1))
    result = run(mesh, problem, gauges_at(*points), tolerance=1e-3, steps=steps)
    assert result.outcome is Outcome.finished
    return result


def with_points(mesh: Mesh, move) -> Mesh:
    """Return the mesh with its nodes moved by a function of complex places; cells are turned over where that mirrors."""
    z = move(mesh.points[:, 0] + 1j * mesh.points[:, 1])
    moved = replace(mesh, points=np.column_stack((z.real, z.imag)))
    return moved if moved.areas.min() > 0 else replace(moved, cells=mesh.cells[:, ::-1])
