"""The mesh of a plan: three cells across every part, arcs followed, names and areas verified, any thread."""

import importlib
import math
import signal
import subprocess
import sys
import threading
from dataclasses import replace

import numpy as np
import pytest

from fem.errors import MeshError, SystemLibraryMissing
from fem.mesh.data import Mesh
from fem.mesh.draw import Drawer
from fem.mesh.gmsh_session import gmsh_session
from fem.mesh.make import make_mesh
from fem.mesh.verify import bows, verify
from fem.section.build import build_plan
from tests.support.quality import quality
from tests.support.shapes import cells_crossed, disc, outline, rect, ring_sector

T_PROFILE = [
    (-0.1, 0),
    (0.1, 0),
    (0.1, 0.008),
    (0.003, 0.008),
    (0.003, 0.2),
    (-0.003, 0.2),
    (-0.003, 0.008),
    (-0.1, 0.008),
]
L_PROFILE = [(0, 0), (1, 0), (1, 0.1), (0.04, 0.1), (0.04, 1), (0, 1)]
OFFSET_BLOCKS = [(0, 0), (1, 0), (1, 0.52), (2, 0.52), (2, 1.5), (0.98, 1.5), (0.98, 0.5), (0, 0.5)]
QUARTER = outline("q", [(0, 0), (1, 0), (0, 1)], vias={1: (math.cos(math.pi / 4), math.sin(math.pi / 4))})


def along(p0, p1, q0, q1, n=41, ends=0.003):
    """Return n lines across a part: from a point between p0 and p1 to the one between q0 and q1."""
    f = np.linspace(ends, 1 - ends, n)[:, None]
    p0, p1, q0, q1 = (np.array(z, dtype=float) for z in (p0, p1, q0, q1))
    return list(zip(p0 + f * (p1 - p0), q0 + f * (q1 - q0), strict=True))


def radial(centre, r0, r1, n=41, angle0=0.003, angle1=6.28):
    a = np.linspace(angle0, angle1, n)
    d = np.column_stack((np.cos(a), np.sin(a)))
    return list(zip(np.array(centre) + r0 * d, np.array(centre) + r1 * d, strict=True))


# name: outlines, region whose thickness is meant, lines across it
PARTS = {
    "square": ([rect("a", 0, 0, 1, 1)], 0, along((0, 0), (1, 0), (0, 1), (1, 1))),
    "strip": ([rect("a", 0, 0, 1, 0.01)], 0, along((0, 0), (1, 0), (0, 0.01), (1, 0.01), 301)),
    "upright strip": ([rect("a", 0, 0, 0.01, 1)], 0, along((0, 0), (0, 1), (0.01, 0), (0.01, 1), 301)),
    "flange": ([outline("t", T_PROFILE)], 0, along((-0.1, 0), (0.1, 0), (-0.1, 0.008), (0.1, 0.008), 101)),
    "web": ([outline("t", T_PROFILE)], 0, along((-0.003, 0.008), (-0.003, 0.2), (0.003, 0.008), (0.003, 0.2), 101)),
    "long leg": ([outline("l", L_PROFILE)], 0, along((0, 0.1), (0, 1), (0.04, 0.1), (0.04, 1), 101)),
    "foot": ([outline("l", L_PROFILE)], 0, along((0.04, 0), (1, 0), (0.04, 0.1), (1, 0.1))),
    "ring": ([disc("o", 0, 0, 1), disc("h", 0, 0, 0.93, 0.4, solid=False)], 0, radial((0, 0), 0.93, 1, 101)),
    "eccentric ring": ([disc("o", 0, 0, 5), disc("h", 1.5, 0, 2, 0.4, solid=False)], 0, [((3.5, 0), (5, 0))]),
    "sector": ([ring_sector("s", 0.9, 1, 0, 1.5)], 0, radial((0, 0), 0.9, 1, 61, 0.01, 1.49)),
    "quarter disc": ([QUARTER], 0, along((0, 0), (0.7, 0), (0, 1), (0.7, math.sqrt(0.51)))),
    "disc": ([disc("d", 0, 0, 1)], 0, along((-1, 0), (0.8, -0.6), (1, 0), (-0.8, 0.6))),
    "wedge": ([outline("w", [(0, 0), (1, 0), (1, 0.2)])], 0, along((0.3, 0), (1, 0), (0.3, 0.06), (1, 0.2))),
    "coat on a block": ([rect("a", 0, 0, 1, 0.3), rect("c", 0, 0.3, 1, 0.304)], 1, along((0, 0.3), (1, 0.3), (0, 0.304), (1, 0.304), 301)),
    "block under a coat": ([rect("a", 0, 0, 1, 0.3), rect("c", 0, 0.3, 1, 0.304)], 0, along((0, 0), (1, 0), (0, 0.3), (1, 0.3))),
    "bar in a wall": ([rect("a", 0, 0, 1, 0.3), disc("b", 0.5, 0.1, 0.006)], 1, [((0.494, 0.1), (0.506, 0.1))]),
    "cover of a bar": ([rect("a", 0, 0, 1, 0.3), disc("b", 0.5, 0.011, 0.008)], 0, [((0.5, 0), (0.5, 0.003))]),
    "neck between corners": ([outline("n", OFFSET_BLOCKS)], 0, [((0.98, 0.5), (1, 0.52))]),
    "notch": ([rect("a", 0, 0, 1, 0.3), rect("v", 0.497, 0.02, 0.503, 0.4, solid=False)], 0, [((0.5, 0), (0.5, 0.02))]),
}  # fmt: skip


def drawn_out(lines):
    """Return the lines made a little longer at both ends, so that they surely cross the outermost cells."""
    return [
        ((1.001 * np.array(a) - 0.001 * np.array(b)), (1.001 * np.array(b) - 0.001 * np.array(a))) for a, b in lines
    ]


@pytest.mark.parametrize("across", [3, 4])
@pytest.mark.parametrize("part", PARTS)
def test_at_least_three_cells_lie_across_every_part(part, across):
    shapes, region, lines = PARTS[part]
    mesh = make_mesh(build_plan(shapes), across=across)
    counts = [cells_crossed(mesh, a, b, region) for a, b in drawn_out(lines)]
    assert min(counts) >= 3


def test_more_across_gives_more():
    plan = build_plan([rect("a", 0, 0, 1, 0.05)])
    lines = along((0, 0), (1, 0), (0, 0.05), (1, 0.05))
    assert min(cells_crossed(make_mesh(plan, across=8), a, b) for a, b in lines) >= 7


@pytest.mark.parametrize(
    "shapes", [[disc("d", 0, 0, 1)], [rect("a", 0, 0, 1, 1), disc("v", 0.5, 0.5, 0.01, solid=False)]]
)
def test_a_circle_has_at_least_24_chords_on_it(shapes):
    mesh = make_mesh(build_plan(shapes))
    arcs = [i for i, curve in enumerate(mesh.plan.curves) if curve.kind == "arc"]
    on_arc = mesh.facets[np.isin(mesh.curve, arcs)]
    assert len(on_arc) >= 24
    curve = mesh.plan.curves[arcs[0]]
    radii = np.linalg.norm(mesh.points[on_arc] - curve.centre, axis=2)
    assert radii == pytest.approx(curve.radius, rel=1e-14)


def test_finer_divides_all_sizes():
    plan = build_plan([outline("l", L_PROFILE)])
    coarse, fine = make_mesh(plan), make_mesh(plan, finer=2.0)
    # Twice as fine both ways is four times as many cells, but for rounding to whole cells across thin parts.
    assert 3.0 <= len(fine.cells) / len(coarse.cells) <= 5.0


def test_thin_coat_does_not_make_the_whole_block_fine():
    mesh = make_mesh(build_plan([rect("block", 0, 0, 1, 1), rect("coat", 0, 1, 1, 1.01)]))
    assert np.count_nonzero(mesh.region == 0) < 3 * np.count_nonzero(mesh.region == 1)
    assert mesh.h[mesh.region == 0].max() > 0.1


@pytest.mark.parametrize(
    "part", ["square", "strip", "flange", "foot", "ring", "sector", "quarter disc", "coat on a block"]
)
def test_cells_are_well_shaped(part):
    """Delaunay refinement reaches 20.7 degrees where no input angle is sharp (Ruppert, J. Algorithms 18, 1995)."""
    facts = quality(make_mesh(build_plan(PARTS[part][0])))
    assert np.rad2deg(facts.smallest_angle) > 20.7
    assert facts.mean_ratio > 0.9
    assert facts.not_delaunay < 0.005


def test_names_areas_and_lengths_are_those_of_the_plan():
    shapes = [rect("wall", 0, 0, 1, 0.3), disc("bar", 0.5, 0.3, 0.12, 0.3), rect("deck", 0, 0.3, 0.4, 0.35)]
    plan = build_plan(shapes)
    mesh = make_mesh(plan)
    assert set(mesh.curve) == set(range(len(plan.curves)))
    lines = np.array([c.kind == "line" for c in plan.curves])
    lengths = np.bincount(mesh.curve, mesh.facet_lengths)
    assert lengths[lines] == pytest.approx([c.length for c in plan.curves if c.kind == "line"], rel=1e-12)
    areas = np.bincount(mesh.region, mesh.areas)
    assert areas == pytest.approx(
        plan.region_area, rel=0.01
    )  # chords of 1/24 circle: 1 - sin(x)/x = 1.1 % of a full disc
    assert mesh.outer.tolist() == [min(plan.curves[c].left, plan.curves[c].right) < 0 for c in mesh.curve]


def test_chords_of_a_circle_take_off_the_bows():
    mesh = make_mesh(build_plan([disc("d", 0.2, 0.1, 0.5)]))
    assert mesh.areas.sum() + bows(mesh).sum() == pytest.approx(math.pi * 0.25, rel=1e-12)
    n = len(mesh.facets)
    assert mesh.areas.sum() == pytest.approx(0.5 * n * 0.25 * math.sin(2 * math.pi / n), rel=1e-3)  # regular polygon


def test_axis_of_a_body_of_revolution_is_exact():
    plan = build_plan([outline("hub", [(0, 0), (0.1, 0), (0.07, 0.3), (0, 0.3)])], kind="revolution")
    mesh = make_mesh(plan)
    axis = mesh.facets[[("hub.edge 4" in plan.curves[c].labels) for c in mesh.curve]]
    assert (mesh.points[axis][:, :, 0] == 0.0).all()
    assert mesh.points[:, 0].min() == 0.0


def test_cusps_are_meshed():
    mesh = make_mesh(build_plan([disc("ring", 0, 0, 1.0), disc("bore", 0.5, 0, 0.5, solid=False)]))
    assert mesh.areas.min() > 0


def test_parts_that_touch_in_one_point_share_a_node():
    mesh = make_mesh(build_plan([rect("a", 0, 0, 1, 1), rect("b", 1, 1, 2, 2)]))
    assert np.count_nonzero(np.linalg.norm(mesh.points - 1.0, axis=1) < 1e-12) == 1


def test_void_touching_the_outside_in_one_point_is_meshed():
    diamond = outline("v", [(0.5, 0), (0.7, 0.2), (0.5, 0.4), (0.3, 0.2)], solid=False)
    mesh = make_mesh(build_plan([rect("a", 0, 0, 1, 1), diamond]))
    assert mesh.areas.sum() == pytest.approx(1 - 0.08, rel=1e-12)


# --- gauges ---


def nearest(mesh, point):
    return np.linalg.norm(mesh.points - np.array(point), axis=1).min()


def test_gauges_inside_and_on_curves_become_nodes():
    shapes = [rect("wall", 0, 0, 1, 0.5), disc("bar", 0.5, 0.25, 0.1)]
    on_arc = (0.5 + 0.1 * math.cos(0.7), 0.25 + 0.1 * math.sin(0.7))
    gauges = [(0.2, 0.25), (0.333, 0.0), on_arc, (0.5, 0.25), (0.0, 0.0)]
    mesh = make_mesh(build_plan(shapes), gauges=np.array(gauges))
    assert max(nearest(mesh, g) for g in gauges) < 1e-12


def test_gauge_just_inside_a_curve_makes_no_bad_cells():
    plan = build_plan([rect("a", 0, 0, 1, 0.5)])
    gauge = (0.4, 0.001)
    mesh = make_mesh(plan, gauges=np.array([gauge]))
    assert nearest(mesh, gauge) > 1e-4
    assert np.rad2deg(quality(mesh).smallest_angle) > 20.7


def test_gauges_close_to_each_other_or_outside_make_no_bad_cells():
    plan = build_plan([rect("a", 0, 0, 1, 1)])
    gauges = np.array([(0.5, 0.5), (0.5001, 0.5), (0.3, 0.0), (0.3001, 0.0), (0.0001, 1.0), (7.0, 7.0)])
    mesh = make_mesh(plan, gauges=gauges)
    assert nearest(mesh, gauges[0]) < 1e-12
    assert nearest(mesh, gauges[2]) < 1e-12
    assert np.rad2deg(quality(mesh).smallest_angle) > 20.7


# --- threads, processes, failures ---


def test_threads_make_the_same_meshes_as_the_main_thread():
    plans = [build_plan([disc("d", 0, 0, 1), disc("h", 0, 0, 0.5, solid=False)]), build_plan([outline("l", L_PROFILE)])]
    alone = [make_mesh(plan) for plan in plans]
    made: dict[int, Mesh] = {}

    def work(k):
        for _ in range(3):
            made[k] = make_mesh(plans[k])

    threads = [threading.Thread(target=work, args=(k,)) for k in (0, 1)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    for k in (0, 1):
        assert np.array_equal(made[k].points, alone[k].points)
        assert np.array_equal(made[k].cells, alone[k].cells)


def test_meshing_leaves_ctrl_c_alone():
    before = signal.getsignal(signal.SIGINT)
    make_mesh(build_plan([rect("a", 0, 0, 1, 1)]))
    assert signal.getsignal(signal.SIGINT) is before


def test_another_process_meshes_in_a_thread_and_prints_nothing():
    code = (
        "import threading\n"
        "from fem.section.build import *\nfrom fem.mesh.make import make_mesh\n"
        "plan = build_plan([Outline('a', True, ((0, 0), (1, 0), (0, 1)), (OutlineEdge(),) * 3)])\n"
        "t = threading.Thread(target=make_mesh, args=(plan,)); t.start(); t.join()\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == ""
    assert done.stderr == ""


def test_gmsh_is_closed_after_a_failure():
    gmsh = importlib.import_module("gmsh")
    with pytest.raises(MeshError, match="gmsh gave up"), gmsh_session() as session:
        session.api.model.mesh.embed(0, [99], 2, 99)
    assert not gmsh.isInitialized()
    with pytest.raises(ZeroDivisionError), gmsh_session():
        raise ZeroDivisionError
    assert not gmsh.isInitialized()
    make_mesh(build_plan([rect("a", 0, 0, 1, 1)]))


def test_gmsh_opened_by_others_is_left_alone():
    gmsh = importlib.import_module("gmsh")
    gmsh.initialize(interruptible=False)
    try:
        with pytest.raises(MeshError, match="gmsh is open"):
            make_mesh(build_plan([rect("a", 0, 0, 1, 1)]))
        assert gmsh.isInitialized()
    finally:
        gmsh.finalize()


def test_missing_system_library_is_told_in_one_line(monkeypatch):
    def absent(name):
        raise OSError("libGLU.so.1: cannot open shared object file: No such file or directory")

    monkeypatch.setattr("fem.mesh.gmsh_session.importlib.import_module", absent)
    with pytest.raises(SystemLibraryMissing) as error:
        make_mesh(build_plan([rect("a", 0, 0, 1, 1)]))
    assert "libGLU.so.1" in str(error.value)
    assert "libglu1-mesa" in str(error.value)
    assert "\n" not in str(error.value)


def test_ctrl_c_while_gmsh_works_comes_through(monkeypatch):
    draw = Drawer.draw

    def draw_then_interrupt(self, *given):
        def at(z):
            raise KeyboardInterrupt

        drawn = draw(self, *given)
        self._sizes.at = at
        return drawn

    monkeypatch.setattr(Drawer, "draw", draw_then_interrupt)
    with pytest.raises(KeyboardInterrupt):
        make_mesh(build_plan([rect("a", 0, 0, 1, 1)]))
    assert not importlib.import_module("gmsh").isInitialized()


def test_part_far_too_thin_for_its_length_is_refused_with_its_place():
    plan = build_plan([rect("block", 0, 0, 1, 1), rect("foil", 0, 1, 1, 1.00002)], gap_tolerance=1e-6)
    with pytest.raises(MeshError, match=r"a part at x = .* m, y = 1(\.00002)? m is so thin"):
        make_mesh(plan)


def test_fewer_than_three_across_is_our_own_bug():
    plan = build_plan([rect("a", 0, 0, 1, 1)])
    with pytest.raises(ValueError, match="across"):
        make_mesh(plan, across=2)
    with pytest.raises(ValueError, match="finer"):
        make_mesh(plan, finer=0.0)


# --- planted faults: the verification fires ---


@pytest.fixture(scope="module")
def sound():
    return make_mesh(build_plan([rect("a", 0, 0, 1, 0.5), disc("b", 0.5, 0.25, 0.1), rect("c", 1, 0, 1.5, 0.5)]))


def broken(mesh, **fields):
    return replace(mesh, **{name: change(getattr(mesh, name).copy()) for name, change in fields.items()})


def put(index, value):
    def change(array):
        array[index] = value
        return array

    return change


def cell_inside(mesh, region):
    """Return a cell of a region that touches no curve."""
    inner = ~np.isin(mesh.cells, mesh.facets).any(axis=1) & (mesh.region == region)
    return int(np.flatnonzero(inner)[0])


def node_inside(mesh):
    return int(np.setdiff1d(mesh.cells, mesh.facets)[0])


def facet_on(mesh, label):
    return int(np.flatnonzero([label in mesh.plan.curves[c].labels for c in mesh.curve])[0])


FAULTS = {
    "a cell given to another region": lambda m: (broken(m, region=put(cell_inside(m, 0), 1)), "m2 in the mesh"),
    "all regions shifted": lambda m: (broken(m, region=lambda r: np.roll(r, 8)), "m2 in the mesh"),
    "a region that is not there": lambda m: (broken(m, region=put(0, 3)), "not each has one of 3 regions"),
    "a lost facet": lambda m: (broken(m, facets=lambda f: f[1:], curve=lambda c: c[1:]), "long in the section"),
    "a facet of another curve": lambda m: (broken(m, curve=put(facet_on(m, "a.bottom"), m.curve[facet_on(m, "a.left")])), "in the mesh"),
    "a facet turned round": lambda m: (_turned(m, facet_on(m, "b.rim")), "do not lie between"),
    "two curves swapped": lambda m: (broken(m, curve=lambda c: _swapped(m, c, "a.left", "c.right")), "off it|do not lie"),
    "a node off its arc": lambda m: (_off_arc(m, 1e-6), "long in the section"),
    "a node far off its arc": lambda m: (_off_arc(m, 0.05), "long in the section|inverted"),
    "a node slid along its line": lambda m: (_slid(m), "inverted|long in the section|m2 in the mesh"),
    "a cell twice": lambda m: (_doubled(m), "m2 in the mesh"),
    "a cell left out": lambda m: (_without(m, cell_inside(m, 0)), "m2 in the mesh"),
    "a cell turned round": lambda m: (broken(m, cells=put(3, m.cells[3][::-1])), "inverted"),
    "a stray node": lambda m: (broken(m, points=lambda p: np.vstack((p, [(0.1, 0.1)]))), "belong to no cell"),
    "a crack": lambda m: (_cracked(m), "facets of the mesh"),
}  # fmt: skip


def _swapped(mesh, curve, one, other):
    i, j = mesh.curve[facet_on(mesh, one)], mesh.curve[facet_on(mesh, other)]
    return np.where(curve == i, j, np.where(curve == j, i, curve))


def _turned(mesh, facet):
    return broken(mesh, facets=put(facet, mesh.facets[facet][::-1]))


def _off_arc(mesh, part):
    """Move a node of the bar's rim outwards by a part of the radius."""
    node = mesh.facets[facet_on(mesh, "b.rim"), 1]
    return broken(mesh, points=put(node, mesh.points[node] + part * (mesh.points[node] - (0.5, 0.25))))


def _doubled(mesh):
    return broken(mesh, cells=lambda c: np.vstack((c, c[:1])), region=lambda r: np.append(r, r[0]))


def _slid(mesh):
    corner = mesh.facets[facet_on(mesh, "a.bottom"), 0]
    return broken(mesh, points=put(corner, mesh.points[corner] + (0.01, 0.0)))


def _without(mesh, cell):
    return broken(mesh, cells=lambda c: np.delete(c, cell, axis=0), region=lambda r: np.delete(r, cell))


def _cracked(mesh):
    """Give one cell a node of its own where it had shared one."""
    cell = cell_inside(mesh, 0)
    cells = mesh.cells.copy()
    points = np.vstack((mesh.points, mesh.points[cells[cell, 0]]))
    cells[cell, 0] = len(mesh.points)
    return replace(mesh, points=points, cells=cells)


@pytest.mark.parametrize("fault", FAULTS)
def test_verification_fires_at(fault, sound):
    verify(sound)
    mesh, said = FAULTS[fault](sound)
    with pytest.raises(MeshError, match=said):
        verify(mesh)


def test_quality_of_an_equilateral_and_of_a_right_angled_pair():
    plan = build_plan([rect("a", 0, 0, 1, 1)])
    h = math.sqrt(0.75)
    points = np.array([(0.0, 0.0), (1.0, 0.0), (0.5, h), (0.5, -h)])
    cells, facets = np.array([(0, 1, 2), (1, 0, 3)]), np.array([(1, 2), (2, 0), (0, 3), (3, 1)])
    facts = quality(Mesh(points, cells, np.zeros(2, int), facets, np.zeros(4, int), plan))
    assert facts.smallest_angle == pytest.approx(math.pi / 3)
    assert facts.least_ratio == pytest.approx(1.0)
    assert facts.obtuse_facing == facts.not_delaunay == 0.0
    flat = points * (1.0, 0.2)
    facts = quality(Mesh(flat, cells, np.zeros(2, int), facets, np.zeros(4, int), plan))
    assert facts.not_delaunay == 1.0  # both angles that face the common edge are obtuse
    assert facts.largest_angle == pytest.approx(2 * math.atan(0.5 / (0.2 * h)))
    facets = np.array([(0, 1)])
    facts = quality(Mesh(flat[:3], cells[:1], np.zeros(1, int), facets, np.zeros(1, int), plan))
    assert facts.obtuse_facing == 1.0
