"""Orders in space. Linear triangles, lumped: 2 at nodes where the solution is smooth.

Thomee, Galerkin Finite Element Methods for Parabolic Problems, 2nd ed. 2006, ch. 15 (lumped masses) and ch. 6 (maximum norm:
h^2 log(1/h) on irregular meshes, so those are held to order 2 in the mean square). The caps come from the leading error terms
named at each test. Time errors are kept far below by many steps of a fourth-order method.
"""

import numpy as np
import pytest

import fem.mesh.refine
from fem.mesh.make import make_mesh
from fem.mesh.refine import uniform
from fem.results.history import Key
from fem.section.build import build_plan
from fem.solve.run import run
from fem.solve.steady import solve_steady
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import box_plan, face, grid_mesh, problem_on, square, strip
from tests.support.order import assert_order, observed_orders
from tests.support.series import film_roots
from tests.support.shapes import outline, rect, ring_sector

ALL = ("part 0.left", "part 0.right", "part 0.top", "part 0.bottom")
NONE = gauges_at()


def levels(mesh, count=4):
    """Return a mesh and its uniform refinements."""
    meshes = [mesh]
    while len(meshes) < count:
        meshes.append(uniform(meshes[-1])[0])
    return meshes


def last_field(mesh, problem, steps=20):
    """Return the temperatures at the end of a march of equal steps."""
    times = np.linspace(problem.begin, problem.end, steps + 1)
    result = run(mesh, problem, NONE, tolerance=1e-4, steps=Steps(times))
    assert result.frame_times[-1] == problem.end
    return result.frames[-1]


def rms(mesh, error):
    """Return the root mean square over the section: no logarithm of h, which the largest error of irregular meshes has."""
    weight = np.bincount(mesh.cells.ravel(), weights=np.repeat(mesh.areas / 3.0, 3))
    return float(np.sqrt(weight @ error**2 / weight.sum()))


def steady_field(mesh, problem):
    """Return the steady temperatures."""
    return solve_steady(mesh, problem, NONE, tolerance=1e-10).frames[-1]


@pytest.mark.parametrize("alternate", [False, True])
def test_a_decaying_mode_of_the_square_converges_at_order_two(alternate):
    t, errors = 0.05, []
    rate = 2 * np.pi**2
    for cells in (8, 16, 32, 64):
        mesh = square(cells, alternate=alternate)
        x, y = mesh.points.T
        problem = problem_on(
            mesh.plan, [face(mesh.plan, ALL, held=0.0)], start=lambda x, y: np.sin(np.pi * x) * np.sin(np.pi * y), end=t
        )
        exact = np.exp(-rate * t) * np.sin(np.pi * x) * np.sin(np.pi * y)
        errors.append(np.abs(last_field(mesh, problem) - exact).max())
    # Five-point formula: the rate is too small by its part (pi h)^2 / 12 (Thomee, ch. 1). Where the cuts and with them the
    # nodes' volumes alternate, at most twice that.
    theory = np.exp(-rate * t) * rate * t * (np.pi / 64) ** 2 / 12
    assert_order(errors, 2.0, cap=theory * (2.2 if alternate else 1.1))


def test_a_film_mode_on_a_generated_mesh_converges_at_order_two():
    biot, t, errors = 2.0, 0.2, []
    beta = film_roots(biot, 1)[0]
    for mesh in levels(make_mesh(box_plan((0.0, 1.0), 0.6))):
        x = mesh.points[:, 0]
        problem = problem_on(
            mesh.plan, [face(mesh.plan, "part 0.right", film=(biot, 0.0))], start=lambda x, y: np.cos(beta * x), end=t
        )
        exact = np.exp(-(beta**2) * t) * np.cos(beta * x)
        errors.append(rms(mesh, last_field(mesh, problem) - exact))
    h = mesh.h.max()
    assert_order(
        errors, 2.0, cap=beta**2 * h**2 / 8
    )  # the error of linear interpolation of the mode (Ciarlet, 1978, sec. 3.1)


def test_manufactured_k_and_c_over_temperature_converge_at_order_two():
    # T = 300 + 50 exp(-t) cos(pi x) cos(pi y / 2); the source makes it exact for k = 2 + 0.01 (T - 300), rho c = 3 + 0.02 (T - 300).
    def rise(t, x, y):
        return 50.0 * np.exp(-t) * np.cos(np.pi * x) * np.cos(0.5 * np.pi * y)

    def source(t, x, y):
        u = rise(t, x, y)
        ux = -np.pi * 50.0 * np.exp(-t) * np.sin(np.pi * x) * np.cos(0.5 * np.pi * y)
        uy = -0.5 * np.pi * 50.0 * np.exp(-t) * np.cos(np.pi * x) * np.sin(0.5 * np.pi * y)
        return (3.0 + 0.02 * u) * (-u) - 0.01 * (ux**2 + uy**2) + (2.0 + 0.01 * u) * 1.25 * np.pi**2 * u

    t, errors = 0.3, []
    for cells in (6, 12, 24, 48):
        mesh = square(cells)
        held = face(mesh.plan, ALL, held=lambda t, x, y: 300.0 + rise(t, x, y))
        problem = problem_on(
            mesh.plan, [held], k=lambda T: 2.0 + 0.01 * (T - 300.0), rho_c=lambda T: 3.0 + 0.02 * (T - 300.0), source=source,
            start=lambda x, y: 300.0 + rise(0.0, x, y), end=t,
        )  # fmt: skip
        errors.append(np.abs(last_field(mesh, problem, 8) - 300.0 - rise(t, *mesh.points.T)).max())
    assert_order(errors, 2.0, cap=50.0 * np.exp(-t) * (np.pi / 48) ** 2 / 8)  # linear interpolation of the field


def test_heat_flow_through_a_held_edge_converges_at_order_two():
    # T = exp(-t) cos(1 - x): insulated at x = 1, held at x = 0, where -dT/dx = -sin(1) exp(-t) flows in and heat is stored beside it.
    t, errors = 0.5, []
    for cells in (4, 8, 16, 32):
        mesh = strip(cells=cells)
        held = face(mesh.plan, "part 0.left", held=lambda t: np.cos(1.0) * np.exp(-t))
        problem = problem_on(mesh.plan, [held], start=lambda x, y: np.cos(1.0 - x), end=t)
        result = run(mesh, problem, NONE, tolerance=1e-4, steps=Steps(np.linspace(0.0, t, 65)))
        flow = result.history.v1[result.history.row(Key("flow", "part 0.left")), -1]
        errors.append(abs(flow / np.ptp(mesh.points[:, 1]) + np.sin(1.0) * np.exp(-t)))
    # A flow that the balance of the whole section gives: the rule of lumping (trapezium, h^2/12 T'') and the temperatures' own error.
    assert_order(errors, 2.0, cap=np.exp(-t) / 32**2 / 6)


def annulus_errors(count=4):
    """Return errors of a quarter ring, held inside and with a film outside: T = a + b ln r, at nodes."""
    plan = build_plan([ring_sector("ring", 1.0, 2.0, 0.0, np.pi / 2)])
    errors = []
    for mesh in levels(make_mesh(plan), count):
        faces = [face(plan, "ring.inner", held=100.0), face(plan, "ring.outer", film=(3.0, 0.0))]
        T = steady_field(mesh, problem_on(plan, faces, begin=None, end=None))
        # flux at r: -b / r; film at 2: -b / 2 = 3 (100 + b ln 2)
        b = -300.0 / (0.5 + 3.0 * np.log(2.0))
        errors.append(rms(mesh, T - 100.0 - b * np.log(np.hypot(*mesh.points.T))))
    return errors, mesh.h.max()


def test_arcs_converge_at_order_two():
    errors, h = annulus_errors()
    b = 300.0 / (0.5 + 3.0 * np.log(2.0))
    assert_order(errors, 2.0, cap=b * h**2 / 8)  # linear interpolation of b ln r, whose second derivative is at most b


def test_arcs_cut_as_straight_chords_do_not_converge(monkeypatch):
    """Teeth of the test above: without the new nodes on the true arc no refinement sees the geometry's error."""
    monkeypatch.setattr(fem.mesh.refine, "_onto_arcs", lambda *_: None)
    monkeypatch.setattr(fem.mesh.refine, "verify", lambda _: None)
    errors, _ = annulus_errors()
    assert observed_orders(errors)[-1] < 1.0


def test_a_reentrant_corner_converges_at_its_own_order():
    """Temperature r^(2/3) sin(2 phi/3) about an L's corner: nodes away from the corner converge at 2 pi/omega = 4/3.

    Schatz and Wahlbin, Maximum norm estimates in the finite element method on plane polygonal domains, part 1, Math. Comp. 32, 1978.
    """
    plan = build_plan([outline("ell", [(0, 0), (1, 0), (1, 1), (-1, 1), (-1, -1), (0, -1)])])

    def exact(x, y):
        return np.hypot(x, y) ** (2 / 3) * np.sin(2 / 3 * np.mod(np.arctan2(y, x), 2 * np.pi))

    labels = tuple(f"ell.edge {i}" for i in range(1, 7))
    errors = []
    for cells in (8, 16, 32, 64):
        line = np.linspace(-1.0, 1.0, cells + 1)
        mesh = grid_mesh(plan, line, line, lambda x, y: np.where((x > 0) & (y < 0), -1, 0))
        T = steady_field(mesh, problem_on(plan, [face(plan, labels, held=exact)], begin=None, end=None))
        x, y = mesh.points.T
        away = np.hypot(x, y) > 0.4
        errors.append(np.abs(T - exact(x, y))[away].max())
    assert_order(
        errors, 4 / 3, cap=(2 / 64) ** (4 / 3)
    )  # h^(4/3) with a constant of one, the size of the singular term


def test_a_smooth_square_of_the_same_size_does_better_than_the_corner():
    """Teeth of the test above: the order is the corner's, not the scheme's."""
    errors = []
    plan = build_plan([rect("box", -1, -1, 1, 1)])
    labels = ("box.left", "box.right", "box.top", "box.bottom")

    def exact(x, y):
        return np.exp(x) * np.sin(y)

    for cells in (8, 16, 32, 64):
        line = np.linspace(-1.0, 1.0, cells + 1)
        mesh = grid_mesh(plan, line, line)
        T = steady_field(mesh, problem_on(plan, [face(plan, labels, held=exact)], begin=None, end=None))
        errors.append(np.abs(T - exact(*mesh.points.T)).max())
    # Five-point formula on [-1, 1]^2: error at most (1/8) (2)^2/4 h^2/12 (u_xxxx + u_yyyy), Thomee ch. 1, with fourth derivatives below e.
    assert_order(errors, 2.0, cap=(2 / 64) ** 2 / 12 * 0.5 * 2 * np.e)
