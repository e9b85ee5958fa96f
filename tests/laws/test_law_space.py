"""Where a section lies, which way it faces and how it is divided is no matter of physics."""

from dataclasses import replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from fem.results.history import Key
from fem.vouch import vouch
from tests.support.cases import BRICK, box, docket_of, region
from tests.support.grids import box_plan, curves_of, grid_mesh
from tests.support.jobs import FEW, bar, jobs, posed, solved, with_points

ROUNDING = 1e-9
"""Relative: some thousand operations of rounding 1e-16, and the conditioning of the step matrices (below 1e4 here)."""


@FEW
@given(job=jobs(), turn=st.floats(0.0, 6.28), shift=st.tuples(st.floats(-2.0, 2.0), st.floats(-2.0, 2.0)))
def test_turning_and_shifting_change_nothing(job, turn, shift):
    mesh = bar()
    moved = with_points(mesh, lambda z: z * np.exp(1j * turn) + complex(*shift))
    here, there = solved(mesh, posed(job, mesh.plan)), solved(moved, posed(job, mesh.plan))
    np.testing.assert_allclose(there.frames, here.frames, rtol=ROUNDING)
    np.testing.assert_allclose(there.face_heat, here.face_heat, rtol=ROUNDING, atol=ROUNDING * here.exchanged)


@FEW
@given(job=jobs())
def test_mirroring_changes_nothing(job):
    mesh = bar()
    here, there = (solved(m, posed(job, m.plan)) for m in (mesh, with_points(mesh, np.conj)))
    np.testing.assert_allclose(there.frames, here.frames, rtol=ROUNDING)


@FEW
@given(job=jobs(), shift=st.floats(-3.0, 3.0))
def test_a_body_of_revolution_may_be_mirrored_and_shifted_along_its_axis(job, shift):
    mesh = bar(kind="revolution")
    here, there = (solved(m, posed(job, m.plan)) for m in (mesh, with_points(mesh, lambda z: np.conj(z) + 1j * shift)))
    np.testing.assert_allclose(there.frames, here.frames, rtol=ROUNDING)


@FEW
@given(job=jobs())
def test_a_ring_far_from_the_axis_is_a_planar_section(job):
    """With radius R the ring differs from a plane by 1/R; heat over the mean circumference too (teeth: the weight 2 pi r)."""
    flat = bar()
    mesh, far = bar(kind="revolution"), 1e7
    ring = with_points(mesh, lambda z: z + far)
    plane, turned = solved(flat, posed(job, flat.plan)), solved(ring, posed(job, mesh.plan))
    np.testing.assert_allclose(turned.frames, plane.frames, rtol=10.0 / far)
    assert np.isclose(turned.stored, plane.stored * 2 * np.pi * far, rtol=1e-4, atol=1e-4 * plane.exchanged * far)


@FEW
@given(job=jobs())
def test_a_dummy_interface_changes_nothing(job):
    """The same nodes and cells, once as one region, once as two of the same stock."""
    job = replace(job, k=(job.k[0],) * 2, rho_c=(job.rho_c[0],) * 2, source=0.0)
    two = bar()
    x, y = np.unique(two.points[:, 0]), np.unique(two.points[:, 1])
    one = grid_mesh(box_plan((0.0, 1.0), 0.3), x, y, alternate=True)
    problem = posed(job, two.plan)
    double = replace(problem, faces=tuple(f for f in problem.faces if f.edge in ("part 1.right", "part 0.left")))
    single = replace(
        double,
        conductivity=problem.conductivity[:1],
        heat_capacity=problem.heat_capacity[:1],
        source=(None,),
        start=problem.start[:1],
        faces=tuple(replace(f, curves=curves_of(one.plan, f.edge.replace("part 1", "part 0"))) for f in double.faces),
    )
    here, there = solved(one, single), solved(two, double)
    order = [np.lexsort(m.points.T) for m in (one, two)]
    np.testing.assert_allclose(there.frames[:, order[1]], here.frames[:, order[0]], rtol=ROUNDING)


def turned_docket(angle, mirror=False, split=False, length=0.05):
    """Return an angle-shaped section, turned about the origin, its bar cut in two of the same stock where asked."""

    def place(x, y):
        z = complex(-x if mirror else x, y) * np.exp(1j * angle)
        return z.real, z.imag

    def shape(corners):
        return [[*place(*corner[:2]), corner[2]] for corner in corners]

    parts = [region("foot", shape(box(0, 0, length, 0.02)))]
    if split:
        middle = 0.4 * length
        parts = [region("foot", shape(box(0, 0, middle, 0.02))), region("tip", shape(box(middle, 0, length, 0.02)))]
    on = ("tip.right",) if split else ("foot.right",)
    faces = {
        "hot": {"on": on, "film": {"coefficient": 50.0, "ambient": 700.0}},
        "cold": {"on": ("foot.left",), "held": 293.15},
    }
    gauge = dict(zip(("a", "b"), (place(0.03, 0.011), place(0.045, 0.004)), strict=True))
    return docket_of(parts, faces, stock={"stuff": BRICK}, end=900.0, gauges=gauge)


def test_whole_dockets_agree_within_their_bands_however_they_lie():
    """Through the mesh generator too: the meshes differ, so what must agree are the answers with their bands."""
    base = vouch(turned_docket(0.0))
    times = base.figures.grid.t[base.figures.grid.reported]
    for other in (turned_docket(0.7), turned_docket(0.0, mirror=True), turned_docket(0.0, split=True)):
        record = vouch(other)
        assert record.standing == base.standing == "vouched"
        for name in ("a", "b"):
            for t in times:
                (v, b), (w, c) = base.figures.at(Key("gauge", name), t), record.figures.at(Key("gauge", name), t)
                assert abs(v - w) <= b + c
