"""The march against FiPy, a finite-volume library, on a quench with a known answer, at equal or better error at the gauges.

Square of side 1 m at 100 K above its edges, which are held at 0; alpha = 1e-4 m2/s. The answer is the product of two slab series:
Carslaw and Jaeger, Conduction of Heat in Solids, 2nd ed., 3.3 and 5.6.
"""

import fipy
import numpy as np

from fem.docket import Clock, Docket, Exposure, Gauge, Region, Section, Start, Vertex
from fem.earn.pose import Posed, pose
from fem.mesh.make import Mesh
from fem.results.history import Key
from fem.solve.run import run
from fem.stock import Stock
from tests.bench.quench import mesh_near
from tests.bench.rows import Row, cpu, ratio

ALPHA = 1e-4  # m2/s
BASE, STEP = 300.0, 100.0  # K
END = 2000.0  # s, a Fourier number of 0.2
TIMES = np.array([250.0, 500.0, 1000.0, 2000.0])
CELLS = 45  # a side, so that both gauges are centres of FiPy's cells
GAUGES = ((0.5, 0.5), (0.3, 0.5))
TOLERANCE = 0.3  # K local error per step
FIPY_STEPS = 160
ROUNDS = 3


def slab(x: float, t: float) -> float:
    """Return the slab's answer at 0 <= x <= 1 m as a part of the step."""
    n = 2 * np.arange(60) + 1
    return float(np.sum(4.0 / (np.pi * n) * np.sin(np.pi * n * x) * np.exp(-((np.pi * n) ** 2) * ALPHA * t)))


def exact() -> np.ndarray:
    """Return the answer at the gauges, K above the edges, (n_times, n_gauges)."""
    return np.array([[STEP * slab(x, t) * slab(y, t) for x, y in GAUGES] for t in TIMES])


def job() -> Posed:
    corners = ((0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0))
    outline = tuple(Vertex(x=x, y=y, edge="rim") for x, y in corners)
    return pose(
        Docket(
            section=Section(kind="planar", regions=(Region(name="block", stock="plain", outline=outline),)),
            stock={"plain": Stock(conductivity=100.0, density=1000.0, specific_heat=1000.0)},
            exposures=(Exposure(name="bath", on=("block.rim",), held=BASE),),
            clock=Clock(end=END, report_every=250.0),
            start=Start(everywhere=BASE + STEP),
            gauges=tuple(Gauge(name=f"g{i}", x=x, y=y) for i, (x, y) in enumerate(GAUGES)),
        )
    )


def ours(posed: Posed, mesh: Mesh) -> np.ndarray:
    """Return our answer, set-up of the equations included; the mesh is given, as FiPy's grid costs nothing."""
    first = float(np.median(mesh.h)) ** 2 / ALPHA
    history = run(mesh, posed.problem, posed.gauges, tolerance=TOLERANCE, first=first).history
    rows = [history.row(Key("gauge", f"g{i}")) for i in range(len(GAUGES))]
    return history.sample(TIMES)[rows].T - BASE


def theirs(steps: int, *, second_order: bool) -> np.ndarray:
    """Return FiPy's answer: implicit Euler, or Crank-Nicolson after four implicit Euler steps that damp the jump."""
    grid = fipy.Grid2D(nx=CELLS, ny=CELLS, dx=1.0 / CELLS, dy=1.0 / CELLS)
    T = fipy.CellVariable(mesh=grid, value=STEP)
    T.constrain(0.0, grid.exteriorFaces)
    euler = fipy.TransientTerm() == fipy.DiffusionTerm(coeff=ALPHA)
    trapezoid = fipy.TransientTerm() == fipy.DiffusionTerm(coeff=0.5 * ALPHA) + fipy.ExplicitDiffusionTerm(0.5 * ALPHA)
    # The best of its solvers here, measured: incomplete-Cholesky or plain conjugate gradients, and LU, which is slower.
    solver = fipy.LinearPCGSolver(tolerance=1e-8, precon=None)
    dt, found, at = END / steps, [], []
    for x, y in GAUGES:
        at.append(int(y * CELLS) * CELLS + int(x * CELLS))
    for n in range(steps):
        (trapezoid if second_order and n >= 4 else euler).solve(var=T, dt=dt, solver=solver)
        if np.any(np.isclose((n + 1) * dt, TIMES)):
            found.append(T.value[at])
    return np.array(found)


def rows() -> list[Row]:
    posed, answer = job(), exact()
    found = []
    for name, second_order, nodes in (("implicit Euler", False, 500), ("Crank-Nicolson", True, 2400)):
        mesh = mesh_near(posed, nodes)
        our_error = float(np.max(np.abs(ours(posed, mesh) - answer)))
        error = float(np.max(np.abs(theirs(FIPY_STEPS, second_order=second_order) - answer)))
        value, a, b = ratio(
            lambda m=mesh: cpu(lambda: ours(posed, m)),
            lambda s=second_order: cpu(lambda: theirs(FIPY_STEPS, second_order=s)),
            ROUNDS,
        )
        case = f"{CELLS} x {CELLS} cells, {FIPY_STEPS} steps of {name}; ours {len(mesh.points)} unknowns"
        note = f"{a:.3f} against {b:.2f} s of CPU; error at the gauges {our_error:.3f} against {error:.3f} K"
        found.append(Row("run / FiPy", case, value, 1 / 20, note))
        found.append(Row("our error / FiPy's", case, our_error / error, 1.0))
    return found
