"""Refinement: nested numbering, names kept, nodes on true arcs, conforming local splits."""

import math

import numpy as np
import pytest

from fem.errors import MeshError
from fem.mesh.arc_room import cramped
from fem.mesh.data import Mesh
from fem.mesh.make import make_mesh
from fem.mesh.refine import local, uniform
from fem.mesh.verify import verify
from fem.section.build import build_plan
from tests.support.quality import quality
from tests.support.shapes import disc, outline, rect, ring_sector

STRAIGHT = [rect("a", 0, 0, 1, 0.4), outline("b", [(0.5, 0.1), (0.9, 0.1), (0.7, 0.3)])]
CURVED = [rect("wall", 0, 0, 1, 0.6), disc("bar", 0.5, 0.3, 0.2, 0.3), disc("bore", 0.52, 0.3, 0.08, solid=False)]


@pytest.fixture(scope="module")
def straight():
    return make_mesh(build_plan(STRAIGHT))


@pytest.fixture(scope="module")
def curved():
    return make_mesh(build_plan(CURVED))


def lengths(mesh):
    """Return the length of each label in the mesh, m."""
    out: dict[str, float] = {}
    for c, length in zip(mesh.curve, mesh.facet_lengths, strict=True):
        for label in mesh.plan.curves[c].labels:
            out[label] = out.get(label, 0.0) + length
    return out


def off_arcs(mesh):
    """Return the largest distance of a facet's end from its arc's circle, over the radius."""
    worst = 0.0
    for c, ends in zip(mesh.curve, mesh.points[mesh.facets], strict=True):
        curve = mesh.plan.curves[c]
        if curve.kind == "arc":
            r = np.linalg.norm(ends - curve.centre, axis=1)
            worst = max(worst, float(np.abs(r / curve.radius - 1.0).max()))
    return worst


# --- uniform ---


def test_uniform_keeps_old_nodes_and_numbers_children(straight):
    finer, _ = uniform(straight)
    m, n = len(straight.cells), len(straight.points)
    assert len(finer.cells) == 4 * m
    assert np.array_equal(finer.points[:n], straight.points)
    for child in range(4):
        part = slice(child * m, (child + 1) * m)
        assert finer.areas[part] == pytest.approx(straight.areas / 4, rel=1e-9)
        assert np.array_equal(finer.region[part], straight.region)
        if child < 3:
            assert np.array_equal(finer.cells[part][:, child], straight.cells[:, child])
    middle = finer.points[finer.cells[3 * m :]].mean(axis=1)
    assert middle == pytest.approx(straight.points[straight.cells].mean(axis=1), rel=1e-12)


def test_prolongation_carries_linear_fields_exactly(straight):
    finer, up = uniform(straight)
    assert up.shape == (len(finer.points), len(straight.points))
    field = 3.0 + straight.points @ (2.0, -5.0)
    assert up @ field == pytest.approx(3.0 + finer.points @ (2.0, -5.0), rel=1e-12)


def test_prolongation_is_an_average_that_keeps_old_values(curved):
    finer, up = uniform(curved)
    n = len(curved.points)
    assert np.array_equal(up[:n].toarray(), np.eye(n))
    assert up @ np.ones(n) == pytest.approx(np.ones(len(finer.points)), rel=1e-15)
    assert set(up[n:].data) == {0.5}


def test_uniform_keeps_names(curved):
    finer, _ = uniform(curved)
    before, after = lengths(curved), lengths(finer)
    assert before.keys() == after.keys()
    for label, length in before.items():
        exact = sum(c.length for c in curved.plan.curves if label in c.labels)
        assert length <= after[label] * (1 + 1e-12)
        assert after[label] <= exact * (1 + 1e-12)
    assert len(finer.facets) == 2 * len(curved.facets)


def test_new_nodes_lie_on_outer_and_inner_arcs(curved):
    mesh = curved
    for _ in range(3):
        mesh, _ = uniform(mesh)
        assert off_arcs(mesh) < 1e-14


def order(errors):
    """Return the observed order between the last two of the levels, each half the size of the one before."""
    return math.log2(errors[-2] / errors[-1])


@pytest.mark.parametrize(
    ("shape", "exact"),
    [(disc("d", 0.1, 0.2, 0.5), math.pi * 0.25), (ring_sector("s", 0.5, 1.0, 0.1, 1.6), 0.5 * 1.5 * 0.75)],
)
def test_area_converges_to_the_true_one_at_order_two(shape, exact):
    """A chord of length c leaves out a bow of c^3 / (12 R) + ..., and there are 1/c of them: order 2."""
    mesh = make_mesh(build_plan([shape]))
    errors = [abs(mesh.areas.sum() - exact)]
    for _ in range(3):
        mesh, _ = uniform(mesh)
        errors.append(abs(mesh.areas.sum() - exact))
    assert 1.85 < order(errors) < 2.35
    assert errors[-1] < 2e-4 * exact  # 192 chords a turn: 1 - sin(x) / x with x = 2 pi / 192


def test_region_areas_inside_converge_too(curved):
    """The interface between bar and wall is an arc: chords that stayed straight would keep its error at every level."""
    exact, errors = curved.plan.region_area[1], []
    mesh = curved
    for _ in range(3):
        errors.append(abs(np.bincount(mesh.region, mesh.areas)[1] - exact))
        mesh, _ = uniform(mesh)
    assert 1.85 < order(errors) < 2.35


def test_uniform_in_a_cusp_stays_sound():
    mesh = make_mesh(build_plan([disc("ring", 0, 0, 1.0), disc("bore", 0.5, 0, 0.5, solid=False)]))
    for _ in range(3):
        mesh, _ = uniform(mesh)
    assert mesh.areas.min() > 0


def bumped():
    """Return two cells over a bump that is higher than they can follow."""
    plan = build_plan([outline("a", [(-1, 0), (1, 0), (1, 0.3), (-1, 0.3)], vias={0: (0, 0.28)})])
    points = np.array([(-1, 0), (1, 0), (1, 0.3), (-1, 0.3)], dtype=float)
    cells = np.array([(0, 1, 2), (0, 2, 3)])
    facets = np.array([(0, 1), (1, 2), (2, 3), (3, 0)])
    labels = [next(i for i, c in enumerate(plan.curves) if f"a.edge {k}" in c.labels) for k in (1, 2, 3, 4)]
    return Mesh(points, cells, np.zeros(2, dtype=int), facets, np.array(labels), plan)


def test_mesh_too_coarse_for_its_arc_is_refused():
    mesh = bumped()
    verify(mesh)
    with pytest.raises(MeshError, match="inverted"):
        uniform(mesh)


def test_cramped_facets_are_found():
    assert cramped(bumped()).tolist() == [True, False, False, False]
    assert not cramped(make_mesh(bumped().plan)).any()


# --- local ---


def test_local_splits_marked_cells_and_names_parents(straight):
    marked = np.zeros(len(straight.cells), dtype=bool)
    marked[::7] = True
    finer, parent = local(straight, marked)
    children = np.bincount(parent, minlength=len(straight.cells))
    assert (children[marked] == 4).all()
    assert children.min() >= 1
    assert children.max() == 4
    assert np.bincount(parent, finer.areas) == pytest.approx(straight.areas, rel=1e-9)
    assert np.array_equal(finer.region, straight.region[parent])
    assert np.array_equal(finer.points[: len(straight.points)], straight.points)
    assert len(finer.cells) < 4 * len(straight.cells)


def test_parents_hold_their_children(straight):
    rng = np.random.default_rng(5)
    finer, parent = local(straight, rng.random(len(straight.cells)) < 0.3)
    middle = finer.points[finer.cells].mean(axis=1)
    a, b, c = (straight.points[straight.cells[parent][:, k]] for k in range(3))
    for p, q in ((a, b), (b, c), (c, a)):
        u, v = q - p, middle - p
        assert (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0] > 0).all()


def test_local_keeps_names_and_arcs(curved):
    rng = np.random.default_rng(3)
    mesh = curved
    for _ in range(4):
        mesh, _ = local(mesh, rng.random(len(mesh.cells)) < 0.2)
        assert off_arcs(mesh) < 1e-14
    assert lengths(mesh).keys() == lengths(curved).keys()
    finer, _ = uniform(mesh)
    assert off_arcs(finer) < 1e-14


def test_local_of_nothing_changes_nothing(straight):
    same, parent = local(straight, np.zeros(len(straight.cells), dtype=bool))
    assert np.array_equal(parent, np.arange(len(straight.cells)))
    assert np.array_equal(np.sort(same.cells, axis=1), np.sort(straight.cells, axis=1))
    assert np.array_equal(same.facets, straight.facets)


def test_local_of_everything_is_uniform(straight):
    finer, parent = local(straight, np.ones(len(straight.cells), dtype=bool))
    red, _ = uniform(straight)
    assert (np.bincount(parent) == 4).all()
    assert finer.areas.sum() == pytest.approx(red.areas.sum(), rel=1e-12)
    assert len(finer.points) == len(red.points)


def test_local_refinement_into_a_corner_keeps_angles():
    """Halving longest edges keeps at least half of the smallest angle (Rosenberg & Stenger, SIAM J. Numer. Anal. 12, 1975)."""
    mesh = make_mesh(build_plan([outline("l", [(0, 0), (1, 0), (1, 0.5), (0.5, 0.5), (0.5, 1), (0, 1)])]))
    least = quality(mesh).smallest_angle
    for _ in range(10):
        corner = int(np.argmin(np.linalg.norm(mesh.points - 0.5, axis=1)))
        mesh, _ = local(mesh, (mesh.cells == corner).any(axis=1))
    assert quality(mesh).smallest_angle > 0.5 * least - 1e-9
    assert mesh.h.min() < 1e-3 * mesh.h.max()


def test_refinement_of_a_thin_curved_part_stays_sound():
    """Cells beside a bump that are halved over a whole chord would be crushed next time; local splits them in four instead."""
    mesh = make_mesh(build_plan([disc("ring", 0, 0, 1.0), disc("bore", 0.4, 0, 0.58, solid=False)]))
    rng = np.random.default_rng(1)
    for _ in range(4):
        mesh, _ = local(mesh, rng.random(len(mesh.cells)) < 0.15)
    for _ in range(2):
        mesh, _ = uniform(mesh)
    assert mesh.areas.min() > 0
