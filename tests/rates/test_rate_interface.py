"""Order in space where two stocks meet: still 2, since the mesh has an edge along the joint."""

import numpy as np

from fem.mesh.make import make_mesh
from fem.mesh.refine import uniform
from fem.solve.run import run
from fem.solve.steady import solve_steady
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import box_plan, face, problem_on, strip
from tests.support.order import assert_order
from tests.support.series import two_layer_mode

K, RHO_C, XS = (1.0, 7.0), (2.0, 0.5), (0.0, 0.4, 1.0)


def test_a_decaying_mode_of_two_layers_converges_at_order_two():
    rate, phi = two_layer_mode(K, RHO_C, (XS[1], XS[2] - XS[1]))
    t, errors = 0.5 / rate, []
    for cells in (4, 8, 16, 32):
        mesh = strip(XS, cells)
        faces = [face(mesh.plan, ("part 0.left"), held=0.0), face(mesh.plan, "part 1.right", held=0.0)]
        problem = problem_on(mesh.plan, faces, k=K, rho_c=RHO_C, start=lambda x, y: phi(x), end=t)
        last = run(mesh, problem, gauges_at(), tolerance=1e-4, steps=Steps(np.linspace(0, t, 17))).frames[-1]
        errors.append(np.abs(last - np.exp(-0.5) * phi(mesh.points[:, 0])).max())
    # Part of the decay lost: 1/2 (q h)^2 / 12 in the layer with the longer cells in terms of the wave number q, here the first.
    waves = [np.sqrt(rate * c / k) * (b - a) / 32 for k, c, a, b in zip(K, RHO_C, XS[:-1], XS[1:], strict=True)]
    assert_order(errors, 2.0, cap=2 * np.exp(-0.5) * phi(mesh.points[:, 0]).max() * max(waves) ** 2 / 12)


def test_a_steady_joint_with_sources_converges_at_order_two_on_a_generated_mesh():
    # Layer 1 makes heat 10 W/m3 (k = 1), layer 2 none (k = 7), ends held at 0: a parabola, then a straight line.
    g, (a, b) = 10.0, (0.4, 0.6)
    flow = g * a**2 / 2 / K[0] / (a / K[0] + b / K[1])  # W/m2 that leave through layer 2

    def exact(x):
        # k T' = c - g x in layer 1 with k T' = -flow at the joint, so c = g a - flow
        left = ((g * a - flow) * x - g * x**2 / 2) / K[0]
        return np.where(x <= a, left, flow * (1.0 - x) / K[1])

    mesh, errors = make_mesh(box_plan(XS, 0.3)), []
    for level in range(4):
        mesh = uniform(mesh)[0] if level else mesh
        faces = [face(mesh.plan, "part 0.left", held=0.0), face(mesh.plan, "part 1.right", held=0.0)]
        T = solve_steady(
            mesh,
            problem_on(mesh.plan, faces, k=K, source=(g, None), begin=None, end=None),
            gauges_at(),
            tolerance=1e-10,
        )
        weight = np.bincount(mesh.cells.ravel(), weights=np.repeat(mesh.areas / 3.0, 3))
        errors.append(np.sqrt(weight @ (T.frames[-1] - exact(mesh.points[:, 0])) ** 2 / weight.sum()))
    assert_order(errors, 2.0, cap=mesh.h.max() ** 2 / 8 * g / K[0])  # linear interpolation of the parabola
