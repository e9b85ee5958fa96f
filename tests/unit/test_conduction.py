"""The discrete problem, piece by piece, against hand calculation."""

import numpy as np
import pytest

from fem.solve.conduction import Conduction
from fem.solve.problem import STEFAN_BOLTZMANN
from tests.support.grids import face, problem_on, square, strip
from tests.support.jobs import Job, bar, posed


def made(mesh, *faces, **how):
    return Conduction(mesh, problem_on(mesh.plan, faces, **how))


@pytest.mark.parametrize("kind", ["planar", "revolution"])
def test_conduction_of_a_uniform_field_is_nothing_and_symmetric(kind):
    c = made(square(5, kind=kind), k=3.0)
    K = c.stiffness(0.0, c.start())
    assert abs(K @ np.ones(c.n)).max() < 1e-12
    assert abs(K - K.T).max() < 1e-12
    assert np.linalg.eigvalsh(K.toarray())[0] > -1e-12


def test_conduction_carries_k_times_the_gradient():
    mesh = strip((0.0, 0.4, 1.0), 4)
    c = made(mesh, k=(2.0, 6.0))
    x = mesh.points[:, 0]
    T = np.where(x <= 0.4, x / 2.0, 0.2 + (x - 0.4) / 6.0)  # 1 W/m2 to the left all along
    height = np.ptp(mesh.points[:, 1])
    flow = c.stiffness(0.0, T) @ T
    assert flow[x == 0.0].sum() == pytest.approx(-height)
    assert flow[x == 1.0].sum() == pytest.approx(height)
    assert abs(flow[(x > 0) & (x < 1)]).max() < 1e-12


def test_volumes_and_surfaces_are_exact():
    planar, turned = (made(square(4, size=2.0, kind=kind), rho_c=3.0) for kind in ("planar", "revolution"))
    assert planar.capacity(planar.start()).sum() == pytest.approx(3.0 * 4.0)
    assert turned.capacity(turned.start()).sum() == pytest.approx(3.0 * np.pi * 4.0 * 2.0)  # cylinder, r = 2, height 2
    plan = turned.mesh.plan
    for label, area in (("right", 2 * np.pi * 2.0 * 2.0), ("top", np.pi * 4.0), ("left", 0.0)):
        curves = tuple(i for i, c in enumerate(plan.curves) if f"part 0.{label}" in c.labels)
        assert turned.parts.surface(curves).size.sum() == pytest.approx(area, abs=1e-12)


def test_each_kind_of_exposure_puts_in_what_it_says():
    mesh = square(4)
    right = "part 0.right"
    T = np.full(25, 400.0)
    cases = [
        ({"flux": 7.0}, 7.0, 0.0),
        ({"film": (5.0, 300.0)}, 5.0 * (300.0 - 400.0), 5.0),
        ({"radiant": (0.5, 600.0)}, 0.5 * STEFAN_BOLTZMANN * (600.0**4 - 400.0**4), 2.0 * STEFAN_BOLTZMANN * 400.0**3),
        ({"flux": 7.0, "film": (5.0, 300.0)}, 7.0 - 500.0, 5.0),
        ({"film": (lambda T: 0.01 * T, 300.0)}, 4.0 * -100.0, 4.0 + 1.0),  # h, and its own slope times the drive
    ]
    for given, heat, slope in cases:
        loads = made(mesh, face(mesh.plan, right, **given)).loads(0.0, T)
        assert loads.faces[0] == pytest.approx(heat, rel=1e-6)
        assert loads.into.sum() == pytest.approx(heat, rel=1e-6)
        assert loads.slope.sum() == pytest.approx(slope, rel=1e-6)
        assert (loads.into[mesh.points[:, 0] < 1.0] == 0.0).all()


def test_sources_are_counted_by_region():
    mesh = strip((0.0, 0.4, 1.0), 4)
    loads = made(mesh, source=(lambda x, y: 2.0 + 0 * x, lambda t: 3.0 * t)).loads(2.0, np.zeros(len(mesh.points)))
    height = np.ptp(mesh.points[:, 1])
    assert loads.sources == pytest.approx([2.0 * 0.4 * height, 6.0 * 0.6 * height])
    assert loads.into.sum() == pytest.approx(loads.sources.sum())


def test_slopes_are_the_derivatives():
    mesh = bar()
    c = Conduction(mesh, posed(Job(curved=True), mesh.plan))
    T, d = np.linspace(300.0, 500.0, c.n), 1e-3
    up, down = c.loads(0.1, T + d).into, c.loads(0.1, T - d).into
    assert c.loads(0.1, T).slope == pytest.approx(-(up - down) / (2 * d), abs=1e-4)
    assert c.capacity(T) == pytest.approx((c.heat(T + d) - c.heat(T - d)) / (2 * d), rel=1e-4)


def test_held_nodes_take_the_mean_where_two_held_faces_meet():
    mesh = square(4)
    c = made(mesh, face(mesh.plan, "part 0.right", held=300.0), face(mesh.plan, "part 0.top", held=lambda t: 400.0 + t))
    values = dict(zip(map(tuple, mesh.points[c.held]), c.held_values(10.0), strict=True))
    assert values[(1.0, 0.5)] == 300.0
    assert values[(0.5, 1.0)] == 410.0
    assert values[(1.0, 1.0)] == pytest.approx(355.0)
    assert len(c.held) + len(c.free) == c.n


def test_start_keeps_the_heat_where_regions_meet_at_different_temperatures():
    for rho_c in ((1.0, 5.0), (lambda T: 1.0 + T / 300.0, 5.0)):
        mesh = strip((0.0, 0.5, 1.0), 3)
        c = made(mesh, rho_c=rho_c, start=(300.0, 600.0))
        apart = [
            made(strip((a, a + 0.5), 3, height=1 / 6), rho_c=r, start=s)
            for a, r, s in zip((0.0, 0.5), rho_c, (300.0, 600.0), strict=True)
        ]
        assert c.heat(c.start()).sum() == pytest.approx(sum(p.heat(p.start()).sum() for p in apart), rel=1e-9)
        joint = c.start()[mesh.points[:, 0] == 0.5]
        assert ((joint > 300.0) & (joint < 600.0)).all()


@pytest.mark.parametrize(
    ("how", "given", "linear"),
    [
        ({}, {"film": (5.0, lambda t: t)}, True),
        ({"source": lambda t, x, y: t * x * y}, {"flux": lambda t: t}, True),
        ({"k": lambda x, y: 1 + x}, {"held": lambda t: t}, True),
        ({"k": lambda T: 1 + T}, {"held": 1.0}, False),
        ({"k": lambda t: 1 + t}, {"held": 1.0}, False),
        ({"rho_c": lambda T: 1 + T}, {"held": 1.0}, False),
        ({"source": lambda T: T}, {"held": 1.0}, False),
        ({}, {"film": (lambda T: T, 1.0)}, False),
        ({}, {"film": (lambda t: t, 1.0)}, False),
        ({}, {"flux": lambda x, T: T}, False),
        ({}, {"radiant": (0.5, 1.0)}, False),
    ],
)
def test_linear_is_said_of_linear_problems_only(how, given, linear):
    mesh = square(2)
    assert made(mesh, face(mesh.plan, "part 0.right", **given), **how).linear is linear
