"""Order in space in bodies of revolution: 2, the axis included."""

import numpy as np
from scipy.special import j0, j1, jn_zeros

from fem.mesh.make import make_mesh
from fem.mesh.refine import uniform
from fem.section.build import build_plan
from fem.solve.run import run
from fem.solve.steady import solve_steady
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import face, problem_on, square
from tests.support.order import assert_order
from tests.support.shapes import outline

NONE = gauges_at()


def ring_mean(mesh, error):
    """Return the root mean square over the body."""
    r = mesh.points[mesh.cells, 0]
    weight = np.bincount(mesh.cells.ravel(), weights=(mesh.areas[:, None] * (r + r.sum(axis=1, keepdims=True))).ravel())
    return float(np.sqrt(weight @ error**2 / weight.sum()))


def test_a_decaying_mode_of_a_cylinder_converges_at_order_two():
    # exp(-a t) J0(j r) cos(pi z), held at r = 1, ends insulated (Carslaw and Jaeger, ch. VII and VIII).
    j = jn_zeros(0, 1)[0]
    rate, t, errors = j**2 + np.pi**2, 0.05, []
    for cells in (8, 16, 32, 64):
        mesh = square(cells, kind="revolution")
        r, z = mesh.points.T
        problem = problem_on(
            mesh.plan,
            [face(mesh.plan, "part 0.right", held=0.0)],
            start=lambda x, y: j0(j * x) * np.cos(np.pi * y),
            end=t,
        )
        last = run(mesh, problem, NONE, tolerance=1e-4, steps=Steps(np.linspace(0, t, 17))).frames[-1]
        errors.append(ring_mean(mesh, last - np.exp(-rate * t) * j0(j * r) * np.cos(np.pi * z)))
    assert_order(
        errors, 2.0, cap=np.exp(-rate * t) * rate * t * (np.pi / 64) ** 2 / 12
    )  # of the decay number, as on a square


def test_heat_out_of_a_cylinder_converges_at_order_two():
    # k = 1: a full turn of height 1 loses 2 pi j J1(j) / a (1 - exp(-a t)) of what it stored, a = j^2.
    j, t, errors = jn_zeros(0, 1)[0], 0.1, []
    for cells in (8, 16, 32, 64):
        mesh = square(cells, kind="revolution")
        problem = problem_on(
            mesh.plan, [face(mesh.plan, "part 0.right", held=0.0)], start=lambda x, y: j0(j * x), end=t
        )
        result = run(mesh, problem, NONE, tolerance=1e-4, steps=Steps(np.linspace(0, t, 17)))
        errors.append(abs(result.face_heat[0] + 2 * np.pi * j1(j) / j * (1 - np.exp(-(j**2) * t))))
    assert_order(
        errors, 2.0, cap=2 * np.pi * j1(j) / j * (j / 64) ** 2
    )  # the mode's own (j h)^2, with a constant of one


def test_a_decaying_mode_of_a_sphere_converges_at_order_two():
    # exp(-pi^2 t) sin(pi R) / R about the origin: an arc that is turned about the axis (Carslaw and Jaeger, ch. IX).
    quarter = outline("ball", [(0, 0), (1, 0), (0, 1)], {1: "skin"}, {1: (np.sqrt(0.5), np.sqrt(0.5))})
    plan = build_plan([quarter], kind="revolution")

    def mode(x, y):
        return np.pi * np.sinc(np.hypot(x, y))

    mesh, t, errors = make_mesh(plan), 0.1, []
    for level in range(4):
        mesh = uniform(mesh)[0] if level else mesh
        problem = problem_on(plan, [face(plan, "ball.skin", held=0.0)], start=mode, end=t)
        last = run(mesh, problem, NONE, tolerance=1e-4, steps=Steps(np.linspace(0, t, 17))).frames[-1]
        errors.append(ring_mean(mesh, last - np.exp(-(np.pi**2) * t) * mode(*mesh.points.T)))
    assert_order(errors, 2.0, cap=np.pi * (np.pi * mesh.h.max()) ** 2 / 8)  # linear interpolation of the mode


def test_a_steady_ring_converges_at_order_two():
    # a + b ln r between r = 1 (held) and 2 (film), any height: Incropera and DeWitt, sec. 3.3.
    errors = []
    ring = outline("ring", [(1, 0), (2, 0), (2, 0.5), (1, 0.5)], {1: "outer", 3: "inner"})
    plan = build_plan([ring], kind="revolution")
    mesh = make_mesh(plan)
    b = -300.0 / (0.5 + 3.0 * np.log(2.0))
    for level in range(4):
        mesh = uniform(mesh)[0] if level else mesh
        faces = [face(plan, "ring.inner", held=100.0), face(plan, "ring.outer", film=(3.0, 0.0))]
        T = solve_steady(mesh, problem_on(plan, faces, begin=None, end=None), NONE, tolerance=1e-10).frames[-1]
        errors.append(ring_mean(mesh, T - 100.0 - b * np.log(mesh.points[:, 0])))
    assert_order(errors, 2.0, cap=abs(b) * mesh.h.max() ** 2 / 8)
