"""The plan of a section: exact areas and lengths, names, interfaces, and what is refused."""

import math
import re

import numpy as np
import pytest

from fem.docket import Docket, Exposure, Region, Section, Start, Stretch
from fem.errors import SectionError
from fem.mesh.gmsh_session import gmsh_session
from fem.quantities.units import FileUnits, Reading
from fem.section.build import Outline, OutlineEdge, OutlineStretch, build_plan, plan_of, stretch_label
from fem.section.edge import Edge, arc_through, crossings, winding
from fem.section.plan import Plan
from fem.stock import Stock
from tests.support.shapes import disc, moved, outline, rect, ring_sector

ROUNDING = 1e-12  # relative: sums of a few dozen float64 terms


def length_of(plan: Plan, label: str) -> float:
    return sum(curve.length for curve in plan.curves if label in curve.labels)


def area_of(plan: Plan, name: str) -> float:
    return float(plan.region_area[plan.region_names.index(name)])


def refused(outlines, **options):
    with pytest.raises(SectionError) as error:
        build_plan(outlines, **options)
    return error.value.problems


# --- exact measures ---


def test_circle_has_its_area_and_circumference():
    plan = build_plan([disc("d", 0.3, -0.2, 0.07, turned=0.4)])
    assert area_of(plan, "d") == pytest.approx(math.pi * 0.07**2, rel=ROUNDING)
    assert length_of(plan, "d.rim") == pytest.approx(2 * math.pi * 0.07, rel=ROUNDING)


def test_void_makes_a_ring():
    plan = build_plan([disc("d", 0, 0, 1.0), disc("bore", 0, 0, 0.4, turned=1.0, solid=False)])
    assert plan.region_names == ("d",)
    assert area_of(plan, "d") == pytest.approx(math.pi * (1 - 0.16), rel=ROUNDING)
    bore = [curve for curve in plan.curves if "bore.rim" in curve.labels]
    assert {frozenset((c.left, c.right)) for c in bore} == {frozenset((0, -1))}


def test_annular_sector_has_its_area_and_lengths():
    plan = build_plan([ring_sector("s", 0.5, 0.8, 0.2, 1.7)])
    assert area_of(plan, "s") == pytest.approx(0.5 * 1.5 * (0.8**2 - 0.5**2), rel=ROUNDING)
    assert length_of(plan, "s.outer") == pytest.approx(1.5 * 0.8, rel=ROUNDING)
    assert length_of(plan, "s.inner") == pytest.approx(1.5 * 0.5, rel=ROUNDING)
    assert length_of(plan, "s.end") == pytest.approx(0.3, rel=ROUNDING)


@pytest.mark.parametrize("rise", [0.02, 0.5, 0.9])  # flat arc, half circle, more than half
def test_arc_segment_area_follows_the_closed_form(rise):
    shape = outline("b", [(0.0, 0.0), (1.0, 0.0)], vias={0: (0.5, -rise)})
    radius = (0.25 + rise**2) / (2 * rise)
    angle = 2 * math.asin(0.5 / radius) if rise <= 0.5 else 2 * math.pi - 2 * math.asin(0.5 / radius)
    plan = build_plan([shape])
    assert area_of(plan, "b") == pytest.approx(0.5 * radius**2 * (angle - math.sin(angle)), rel=1e-11)


def test_area_far_from_the_origin_keeps_its_digits():
    # Coordinates of 1e4 m carry 2e-12 m of rounding each, over a section of 0.1 m.
    plan = build_plan([moved(ring_sector("s", 0.05, 0.08, 0.2, 1.7), shift=(1e4, -2e4))])
    assert area_of(plan, "s") == pytest.approx(0.5 * 1.5 * (0.08**2 - 0.05**2), rel=1e-8)


# --- later cuts earlier, interfaces ---


def test_bar_over_a_wall_lies_in_the_wall():
    plan = build_plan([rect("wall", 0, 0, 1, 0.5), disc("bar", 0.5, 0.25, 0.1)])
    assert area_of(plan, "bar") == pytest.approx(math.pi * 0.01, rel=ROUNDING)
    assert area_of(plan, "wall") == pytest.approx(0.5 - math.pi * 0.01, rel=ROUNDING)
    assert {frozenset((c.left, c.right)) for c in plan.curves if "bar.rim" in c.labels} == {frozenset((0, 1))}


def test_bar_half_out_of_the_wall():
    plan = build_plan([rect("wall", 0, 0, 1, 0.5), disc("bar", 0.5, 0.5, 0.1)])
    assert area_of(plan, "wall") == pytest.approx(0.5 - math.pi * 0.005, rel=ROUNDING)
    assert length_of(plan, "wall.top") == pytest.approx(0.8, rel=ROUNDING)
    assert area_of(plan, "bar") == pytest.approx(math.pi * 0.01, rel=ROUNDING)


def test_regions_that_share_part_of_an_edge_get_one_interface():
    plan = build_plan([rect("deck", 0, 0, 1, 0.1), rect("beam", 0.4, -0.5, 0.6, 0)])
    shared = [c for c in plan.curves if {"deck.bottom", "beam.top"} <= c.labels]
    assert [c.length for c in shared] == [pytest.approx(0.2)]
    assert {shared[0].left, shared[0].right} == {0, 1}
    assert length_of(plan, "deck.bottom") == pytest.approx(1.0, rel=ROUNDING)


def test_regions_that_share_an_arc_drawn_with_other_points_get_one_interface():
    hole = disc("hole", 0, 0, 1.0, solid=False)
    plan = build_plan([disc("outer", 0, 0, 2.0), hole, disc("core", 0, 0, 1.0, turned=0.7)])
    inner = [c for c in plan.curves if "core.rim" in c.labels]
    assert all({"hole.rim"} <= c.labels and {c.left, c.right} == {0, 1} for c in inner)
    assert sum(c.length for c in inner) == pytest.approx(2 * math.pi, rel=ROUNDING)
    assert len(plan.curves) == 2 + 4


def test_region_cut_in_two_keeps_both_parts():
    plan = build_plan([rect("strip", 0, 0, 1, 0.1), rect("cut", 0.4, -0.1, 0.5, 0.2, solid=False)])
    assert area_of(plan, "strip") == pytest.approx(0.09, rel=ROUNDING)
    assert [face.region for face in plan.faces] == [0, 0]


def test_separate_parts_are_allowed():
    plan = build_plan([rect("a", 0, 0, 1, 1), rect("b", 3, 0, 4, 1)])
    assert len(plan.faces) == 2
    assert plan.notes == ()


def test_region_in_a_hole_of_a_region_in_a_hole():
    shapes = [
        disc("a", 0, 0, 5),
        disc("v", 0, 0, 4, solid=False),
        disc("b", 0, 0, 3),
        disc("w", 0, 0, 2, solid=False),
        disc("c", 0, 0, 1),
    ]
    plan = build_plan(shapes)
    assert plan.region_area / math.pi == pytest.approx([9.0, 5.0, 1.0], rel=ROUNDING)
    assert sorted(len(face.loops) for face in plan.faces) == [1, 2, 2]


def test_edges_under_a_later_region_are_told():
    plan = build_plan([rect("wall", 0, 0, 1, 1), rect("over", -0.1, 0.5, 1.1, 1.2)])
    assert plan.hidden == {"wall.top"}


# --- names ---


def test_unnamed_edges_are_called_by_their_number():
    plan = build_plan([outline("t", [(0, 0), (1, 0), (0, 1)], {1: "slope"})])
    assert {label for c in plan.curves for label in c.labels} == {"t.edge 1", "t.slope", "t.edge 3"}


def test_names_survive_an_inserted_vertex():
    plain = build_plan([rect("a", 0, 0, 1, 1)])
    names = dict(enumerate(("bottom", "bottom", "right", "top", "left")))
    split = build_plan([outline("a", [(0, 0), (0.3, 0), (1, 0), (1, 1), (0, 1)], names)])
    for edge in ("bottom", "right", "top", "left"):
        assert length_of(split, f"a.{edge}") == pytest.approx(length_of(plain, f"a.{edge}"), rel=ROUNDING)


@pytest.mark.parametrize("clockwise", [False, True])
def test_stretch_runs_counter_clockwise_and_splits_curves(clockwise):
    shape = rect("a", 0, 0, 2, 1)
    if clockwise:
        shape = outline("a", shape.vertices[::-1], dict(enumerate(("top", "right", "bottom", "left"))))
    stretch = OutlineStretch("a", (1.5, -0.1), (2.2, 0.25), "warm")
    rest = OutlineStretch("a", (2.2, 0.25), (1.5, -0.1), "cold")
    plan = build_plan([shape], stretches=[stretch, rest])
    assert length_of(plan, "warm") == pytest.approx(0.75, rel=ROUNDING)
    assert length_of(plan, "cold") == pytest.approx(6 - 0.75, rel=ROUNDING)
    assert length_of(plan, "a.bottom") == pytest.approx(2.0, rel=ROUNDING)


def test_stretch_survives_an_inserted_vertex():
    stretch = OutlineStretch("a", (0.2, 0.0), (0.9, 0.0), "warm")
    for points in ([(0, 0), (1, 0), (1, 1), (0, 1)], [(0, 0), (0.5, 0), (1, 0), (1, 1), (0, 1)]):
        assert length_of(build_plan([outline("a", points)], stretches=[stretch]), "warm") == pytest.approx(
            0.7, rel=ROUNDING
        )


def test_stretch_of_nobody_and_of_no_length_are_refused():
    problems = refused(
        [rect("a", 0, 0, 1, 1)],
        stretches=[OutlineStretch("b", (0, 0), (1, 0), "x"), OutlineStretch("a", (0.5, -1), (0.5, -2), "y")],
    )
    assert [p.value for p in problems] == ['"b"', "a stretch of no length"]


def test_docket_gives_the_plan_with_its_voids_arcs_and_stretches():
    warm = Stretch(region="wall", start=(0.2, 0.0), end=(0.7, 0.0))
    wall = Region(name="wall", stock="brick", outline=((0, 0, "foot"), (1, 0), (1, 0.5), (0, 0.5)))
    half = ((0.4, 0.25, "rim", {"via": (0.5, 0.15)}), (0.6, 0.25, "rim", {"via": (0.5, 0.35)}))
    docket = Docket(
        section=Section(kind="planar", regions=(wall, Region(name="duct", stock=None, outline=half))),
        stock={"brick": Stock(conductivity=1.0, density=2000.0, specific_heat=900.0)},
        exposures=(Exposure(name="floor", on=(warm, "wall.foot"), held=300.0),),
        clock=None,
        start=Start(everywhere=300.0),
    )
    plan = plan_of(docket)
    assert plan.region_names == ("wall",)
    assert area_of(plan, "wall") == pytest.approx(0.5 - math.pi * 0.01, rel=ROUNDING)
    assert length_of(plan, stretch_label(warm)) == pytest.approx(0.5, rel=ROUNDING)
    assert length_of(plan, "duct.rim") == pytest.approx(0.2 * math.pi, rel=ROUNDING)
    assert plan.gap_tolerance == docket.section.gap_tolerance


# --- invariance ---

SHAPES = [
    rect("wall", 0, 0, 1, 0.3),
    disc("bar", 0.5, 0.3, 0.1234, 0.3),
    disc("pipe", 0.3, 0.12, 0.1, 0.7),
    disc("bore", 0.31, 0.12, 0.05, 0.1, solid=False),
    rect("deck", 0, 0.3, 0.4, 0.35),
]


def facts(plan: Plan):
    """Return labels, kind, sides and length of each curve."""
    return [(sorted(c.labels), c.kind, sorted((c.left, c.right)), c.length) for c in plan.curves]


@pytest.mark.parametrize(
    ("turn", "mirror", "scale", "shift"),
    [(0.7, False, 1, (0, 0)), (math.pi / 2, True, 1, (3, -2)), (2.9, True, 1e-3, (0, 0)), (0, False, 1e3, (0, 0))],
)
def test_moved_sections_give_the_same_plan(turn, mirror, scale, shift):
    plan = build_plan(SHAPES)
    other = build_plan([moved(s, turn, mirror, shift, scale) for s in SHAPES])
    assert other.region_area / scale**2 == pytest.approx(plan.region_area, rel=1e-9)
    for one, two in zip(sorted(facts(plan)), sorted(facts(other)), strict=True):
        assert one[:3] == two[:3]
        assert two[3] / scale == pytest.approx(one[3], rel=1e-9)
    assert other.hidden == plan.hidden


# --- against OpenCASCADE, an independent general-purpose geometry kernel ---


def occ_areas(discs, box):
    """Return the areas that remain of a box and of discs, later cutting earlier, as OpenCASCADE finds them."""
    with gmsh_session() as gmsh:
        occ = gmsh.api.model.occ

        def drawn():
            tags = [occ.addRectangle(*box[:2], 0, *box[2:])]
            return [(2, t) for t in tags + [occ.addDisk(x, y, 0, r, r) for x, y, r in discs]]

        areas = []
        for i in range(len(discs) + 1):
            tools = drawn()
            left = [tools[i]]
            for tool in tools[i + 1 :]:
                left = occ.cut(left, [tool])[0] if left else []
            areas.append(sum(occ.getMass(*face) for face in left))
            occ.remove(occ.getEntities(2), recursive=True)
        return areas


@pytest.mark.parametrize("seed", range(6))
def test_areas_of_random_overlaps_agree_with_opencascade(seed):
    rng = np.random.default_rng(seed)
    discs = [
        (float(x), float(y), float(r))
        for x, y, r in zip(*rng.uniform(0, 1, (2, 5)), rng.uniform(0.05, 0.35, 5), strict=True)
    ]
    shapes = [rect("r0", 0, 0, 1, 0.8)] + [disc(f"r{i}", x, y, r, turned=i) for i, (x, y, r) in enumerate(discs, 1)]
    expected = occ_areas(discs, (0, 0, 1, 0.8))
    plan = build_plan(shapes, gap_tolerance=1e-6)
    # OpenCASCADE integrates areas of trimmed faces to about 1e-6 relative by default.
    assert plan.region_area == pytest.approx(expected, rel=1e-6, abs=1e-9)


# --- what is refused ---


def test_self_crossing_shows_the_spot_and_the_edges():
    (problem,) = refused([outline("bow", [(0, 0), (1, 1), (1, 0), (0, 1)])])
    assert problem.xy == pytest.approx((0.5, 0.5))
    assert problem.place == 'region "bow", edge 1 and edge 3'
    assert "crosses itself" in problem.value


def test_arc_that_crosses_a_line_of_its_own_outline_is_refused():
    problems = refused([outline("a", [(0, 0), (1, 0), (1, 0.2), (0, 0.2)], vias={2: (0.5, -0.1)})])
    assert len(problems) == 2  # the arc dips through the bottom and out again
    assert all("edge 1 and edge 3" in p.place and p.xy[1] == pytest.approx(0, abs=1e-12) for p in problems)


@pytest.mark.parametrize(
    ("points", "what"),
    [
        ([(0, 0), (2, 0), (2, 1), (1, 0), (0, 1)], "touches itself"),  # a vertex on another edge
        ([(0, 0), (1, 0), (0.4, 0), (0, 1)], "touches itself"),  # doubles back
        ([(0, 0), (1, 0), (1, 1), (0.5, 0.5), (0, 1), (0.5, 0.5)], "touches itself"),  # comes twice to one vertex
    ],
)
def test_outline_that_touches_itself_is_refused(points, what):
    assert any(what in p.value for p in refused([outline("a", points)]))


def test_arc_drawn_back_along_itself_is_refused():
    (problem,) = refused([outline("a", [(0, 0), (1, 0)], vias={0: (0.5, 0.2), 1: (0.5, 0.2)})])
    assert "runs back on itself" in problem.value


@pytest.mark.parametrize("points", [[(0, 0), (1, 0)], [(0, 0)], []])
def test_fewer_than_three_vertices_are_refused(points):
    problems = refused([outline("a", points), rect("b", 0, 0, 1, 1)])
    assert problems[0].allowed.startswith("at least 3 vertices")


def test_two_vertices_with_one_arc_are_a_shape():
    plan = build_plan([outline("half", [(-1, 0), (1, 0)], vias={1: (0, 1)})])
    assert area_of(plan, "half") == pytest.approx(math.pi / 2, rel=ROUNDING)


def test_zero_length_edge_is_refused():
    (problem,) = refused([outline("a", [(0, 0), (1, 0), (1, 0), (0, 1)], {1: "nose"})])
    assert problem.place == 'region "a", edge 2 ("nose")'
    assert problem.xy == (1.0, 0.0)


@pytest.mark.parametrize("via", [(0.5, 0.0), (0.0, 0.0), (1.0, 0.0), (2.0, 0.0), (0.5, 1e-9)])
def test_via_on_the_line_through_both_ends_is_refused(via):
    (problem,) = refused([outline("a", [(0, 0), (1, 0), (1, 1)], vias={0: via})])
    assert problem.place == 'region "a", edge 1'
    assert "via point" in problem.value


def test_hair_thin_part_is_refused_at_its_place():
    # A 1 x 1 block with a whisker of 20 um at its top.
    points = [(0, 0), (1, 0), (1, 1), (0.5, 1), (0.5, 1.5), (0.49998, 1.5), (0.49998, 1), (0, 1)]
    (problem,) = refused([outline("a", points)])
    assert problem.value == "a width of 2e-05 m"
    assert problem.xy[0] == pytest.approx(0.49999, abs=1e-5)
    assert 1.0 <= problem.xy[1] <= 1.5
    assert "edge 4" in problem.place
    assert "edge 6" in problem.place


def test_hair_thin_rest_of_a_cut_region_is_refused():
    problems = refused([rect("wall", 0, 0, 1, 1), rect("coat", 0.00001, -0.1, 1.1, 1.1)])
    assert 'region "wall"' in problems[0].place
    assert problems[0].value == "a width of 1e-05 m"


def test_hair_thin_void_is_refused():
    (problem,) = refused([rect("wall", 0, 0, 1, 1), rect("slit", 0.4, 0.2, 0.40001, 0.8, solid=False)])
    assert problem.place.startswith('void "slit"')


def test_hair_thin_ring_is_refused():
    problems = refused([disc("d", 0, 0, 1.0), disc("h", 0, 0, 0.9999, 0.3, solid=False)])
    assert all('region "d"' in p.place and p.value == "a width of 0.0001 m" for p in problems)


def test_needle_is_refused_but_an_acute_wedge_is_not():
    assert refused([outline("needle", [(0, 0), (1, 0), (1, 0.001)])])
    assert build_plan([outline("wedge", [(0, 0), (1, 0), (1, 0.1)])]).notes == ()


def test_cusp_between_tangent_circles_is_no_hair():
    plan = build_plan([disc("ring", 0, 0, 1.0), disc("bore", 0.5, 0, 0.5, solid=False)])
    assert area_of(plan, "ring") == pytest.approx(math.pi * 0.75, rel=1e-9)


def test_thin_part_is_allowed_with_a_lower_tolerance():
    plan = build_plan([rect("foil", 0, 0, 1, 2e-5)], gap_tolerance=1e-5)
    assert area_of(plan, "foil") == pytest.approx(2e-5, rel=1e-9)


def test_wholly_covered_region_is_refused_by_name():
    (problem,) = refused([rect("wall", 0, 0, 1, 1), disc("bar", 0.5, 0.5, 0.1), rect("lining", 0.3, 0.3, 0.7, 0.7)])
    assert problem.place == 'region "bar"'
    assert '"lining"' in problem.hint


def test_gap_is_refused_as_not_closed():
    (problem,) = refused([rect("deck", 0, 0.00001, 1, 0.1), rect("beam", 0.4, -0.5, 0.6, 0)])
    assert problem.value == "a gap of 1e-05 m (it was not closed)"
    assert (
        problem.place == 'between region "deck", edge 1 ("bottom") and region "beam", edge 3 ("top")'
        or problem.place == ('between region "beam", edge 3 ("top") and region "deck", edge 1 ("bottom")')
    )
    assert 0.4 <= problem.xy[0] <= 0.6
    assert "close_gaps" in problem.hint


@pytest.mark.parametrize("gap", [1e-8, 1e-6, 5e-5])
def test_gap_is_closed_and_noted(gap):
    plan = build_plan([rect("deck", 0, gap, 1, 0.1), rect("beam", 0.4, -0.5, 0.6, 0)], close_gaps=True)
    assert len(plan.notes) == 1
    assert plan.notes[0].startswith(f"closed a gap of {gap:.3g} m between ")
    assert length_of(plan, "beam.top") == pytest.approx(0.2, rel=1e-6)
    assert [{c.left, c.right} for c in plan.curves if "beam.top" in c.labels] == [{0, 1}]


def test_gap_below_a_wider_later_region_is_closed():
    plan = build_plan([rect("beam", 0.4, -0.5, 0.6, 0), rect("deck", 0, 2e-5, 1, 0.1)], close_gaps=True)
    assert [{c.left, c.right} for c in plan.curves if "beam.top" in c.labels] == [{0, 1}]


def test_gap_between_arcs_is_closed():
    plan = build_plan(
        [disc("hub", 0, 0, 1.0), disc("bore", 0, 0, 0.5, 0.3, solid=False), disc("shaft", 0, 0, 0.49995, 1.0)],
        close_gaps=True,
    )
    assert plan.notes
    assert all({c.left, c.right} == {0, 1} for c in plan.curves if "shaft.rim" in c.labels)
    assert plan.region_area / math.pi == pytest.approx([0.75, 0.25], rel=1e-9)


def test_slit_within_one_region_is_refused():
    points = [(0, 0), (1, 0), (1, 0.5), (0.2, 0.5), (0.2, 0.50001), (1, 0.50001), (1, 1), (0, 1)]
    (problem,) = refused([outline("c", points)])
    assert "gap of 1e-05 m" in problem.value


def test_overlap_closes_no_gap_and_needs_no_note():
    plan = build_plan([rect("deck", 0, -0.00001, 1, 0.1), rect("beam", 0.4, -0.5, 0.6, 0)])
    assert plan.notes == ()


def test_touch_in_one_point_is_noted():
    plan = build_plan([rect("a", 0, 0, 1, 1), rect("b", 1, 1, 2, 2)])
    (note,) = plan.notes
    assert 'region "a"' in note
    assert 'region "b"' in note
    assert "at (1, 1) m" in note


def test_discs_that_touch_are_noted_and_no_gap():
    plan = build_plan([disc("a", 0, 0, 1, 0.5), disc("b", 3, 0, 2, 0.2)])
    assert len(plan.notes) == 1


def test_negative_radius_is_refused_with_each_vertex():
    problems = refused([rect("hub", -0.1, 0, 1, 1)], kind="revolution")
    assert [p.place for p in problems] == ['region "hub", vertex 1', 'region "hub", vertex 4']
    assert build_plan([rect("hub", -0.1, 0, 1, 1)]).kind == "planar"


def test_arc_beyond_the_axis_is_refused():
    (problem,) = refused(
        [outline("o", [(0.1, 0), (1, 0), (1, 1), (0.1, 1)], vias={3: (-0.05, 0.5)})], kind="revolution"
    )
    assert problem.place == 'region "o", edge 4'
    assert problem.xy[0] < 0


def test_all_faults_are_listed_at_once():
    problems = refused(
        [
            outline("bow", [(0, 0), (1, 1), (1, 0), (0, 1)]),
            outline("short", [(0, 0), (1, 0)]),
            outline("arc", [(0, 0), (1, 0), (1, 1)], vias={0: (0.5, 0)}),
            rect("arc", 0, 0, 1, 1),
        ]
    )
    assert len(problems) == 4
    assert all(p.place and p.allowed and p.hint for p in problems)


def test_sections_without_a_region_and_names_that_clash_are_refused():
    assert "at least one region" in refused([])[0].allowed
    assert refused([rect("v", 0, 0, 1, 1, solid=False)])[0].place == "section"
    (problem,) = refused([outline("a", [(0, 0), (1, 0), (0, 1)], {0: "edge 3"})])
    assert problem.value == '"edge 3"'


def test_outline_needs_one_edge_per_vertex():
    with pytest.raises(ValueError, match="3 vertices and 1 edges"):
        Outline("a", True, ((0, 0), (1, 0), (0, 1)), (OutlineEdge(),))


# --- edges ---


def test_arc_through_three_points():
    arc = arc_through(-1 + 0j, 0 - 1j, 1 + 0j)
    assert arc is not None
    assert arc.centre == pytest.approx(0)
    assert arc.sweep == pytest.approx(math.pi)
    assert arc.reversed().sweep == pytest.approx(-math.pi)
    assert arc.middle == pytest.approx(-1j)


@pytest.mark.parametrize("sweep", [0.3, math.pi, 5.0, -0.3, -5.0])
def test_fraction_undoes_at_on_arcs(sweep):
    start = 2.0 + 1.0j
    arc = Edge(start, complex(1 + 1j + np.exp(1j * sweep)), 1 + 1j, 1.0, sweep)
    f = np.linspace(0.0, 1.0, 11)
    assert arc.fraction(arc.at(f)) == pytest.approx(f, abs=1e-12)
    assert arc.distance(arc.at(f) + 0.1 * (arc.at(f) - (1 + 1j))) == pytest.approx(0.1, abs=1e-12)


def test_circles_meet_where_the_closed_form_says():
    a, b = disc("a", 0, 0, 1.0).chain, disc("b", 1.0, 0, 1.0).chain
    found = {complex(round(z.real, 12), round(z.imag, 12)) for p in a for q in b for z in crossings(p, q, 1e-9)}
    assert found == {complex(0.5, round(s * math.sqrt(0.75), 12)) for s in (1, -1)}


def test_winding_tells_inside_from_outside_near_an_arc():
    half = outline("half", [(-1, 0), (1, 0)], vias={1: (0, 1)}).chain
    z = np.array([0 + 0.999j, 0 + 1.001j, 0 + 0.001j, 0 - 0.001j, 0.8 + 0.59j, 0.8 + 0.61j])
    assert winding(half, z).tolist() == [1, 0, 1, 0, 1, 0]
    assert winding([e.reversed() for e in reversed(half)], z).tolist() == [-1, 0, -1, 0, -1, 0]


@pytest.mark.parametrize("turned", [0.0, 0.3, 1.0])
def test_winding_is_right_on_the_chords_of_arcs(turned):
    loop = disc("d", 0, 0, 1.0, turned).chain  # both chords run through the middle
    z = np.exp(1j * turned) * np.linspace(-0.9, 0.9, 19)
    assert winding(loop, z).tolist() == [1] * 19
    assert winding([e.reversed() for e in reversed(loop)], z).tolist() == [-1] * 19


# --- in which units faults speak


@pytest.mark.parametrize(
    ("outlines", "says"),
    [
        ([[(0, 0), (100, 100), (100, 0), (0, 100)]], "(50, 50) mm"),  # the diagonals of a square
        ([[(0, 0), (100, 0), (100, 50), (0, 50)], [(0, 50.005), (100, 50.005), (100, 90), (0, 90)]], "0.005 mm"),
    ],
)
def test_faults_speak_the_dockets_units(outlines, says):
    regions = [
        {"name": f"part {i}", "stock": "fireclay brick", "outline": [list(corner) for corner in outline]}
        for i, outline in enumerate(outlines)
    ]
    millimetres = FileUnits("mm", "min", "degC")
    data = {"section": {"kind": "planar"}, "region": regions, "clock": {"steady": True}, "units": millimetres}
    with pytest.raises(SectionError) as caught:
        plan_of(Docket.read(data, Reading(units=millimetres)))
    told = str(caught.value)
    assert says in told
    assert not re.search(r"[0-9] m\b", told)
    assert caught.value.problems[0].spot.endswith(" mm")
