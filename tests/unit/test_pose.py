"""From docket to problem: what section and docket must agree on."""

import numpy as np
import pytest

from fem.docket import Limit, Stretch, Wanted
from fem.earn.pose import namer, pose
from fem.errors import DocketError
from fem.quantities.units import FileUnits
from tests.support.cases import BRICK, box, docket_of, region, slab_docket

STEEL = {"conductivity": 40.0, "density": 7800.0, "specific_heat": 500.0, "range": (250.0, 900.0)}


def two(exposures, **more):
    parts = [region("left", box(0, 0, 1, 1)), region("right", box(1, 0, 3, 1), "steel", start=400.0, source=5.0)]
    more.setdefault("end", 10.0)
    return docket_of(parts, exposures, stock={"stuff": BRICK, "steel": STEEL}, gauges={"g": (0.5, 0.5)}, **more)


FILM = {"coefficient": 5.0, "ambient": 300.0}


def refused(docket):
    with pytest.raises(DocketError) as caught:
        pose(docket)
    return [str(p) for p in caught.value.problems]


def test_regions_keep_their_own_values():
    posed = pose(two({"air": {"on": ("left.left",), "film": FILM}}))
    p = posed.problem
    assert [law() for law in p.conductivity] == [1.0, 40.0]
    assert [law() for law in p.heat_capacity] == [1.8e6, 3.9e6]
    assert [law() for law in p.start] == [293.15, 400.0]
    assert p.source[0] is None
    assert p.source[1]() == 5.0
    assert [(s.region, s.stock, s.low, s.high) for s in posed.stocks][1] == ("right", "steel", 250.0, 900.0)
    assert (p.begin, p.end, p.report_every) == (0.0, 10.0, 1.0)


def length_of(posed, face):
    return sum(posed.plan.curves[i].length for i in face.curves)


def test_a_star_takes_the_whole_outside_and_nothing_inside():
    posed = pose(two({"air": {"on": ("left.*",), "film": FILM}}))
    assert length_of(posed, posed.problem.faces[0]) == pytest.approx(3.0)


HALF = Stretch(region="left", start=(0.0, 0.5), end=(0.0, 0.0))


def test_a_stretch_of_an_edge_that_is_named_too_counts_once():
    posed = pose(two({"air": {"on": ("left.left", HALF), "film": FILM}}))
    assert sum(length_of(posed, face) for face in posed.problem.faces) == pytest.approx(1.0)


def test_two_exposures_on_one_edge_add_up():
    posed = pose(two({"air": {"on": ("left.left",), "film": FILM}, "sun": {"on": ("left.left",), "flux": 100.0}}))
    assert [f.name for f in posed.problem.faces] == ["air", "sun"]
    assert posed.problem.faces[0].curves == posed.problem.faces[1].curves


def test_a_stretch_takes_its_own_part():
    on = Stretch(region="right", start=(2.0, 0.0), end=(3.0, 0.5))
    posed = pose(two({"jet": {"on": (on,), "held": 500.0}}))
    assert length_of(posed, posed.problem.faces[0]) == pytest.approx(1.5)


def test_an_edge_between_two_regions_is_refused():
    (text,) = refused(two({"air": {"on": ("left.right",), "film": FILM}}))
    assert "left.right" in text
    assert "between two regions" in text


def test_held_with_anything_else_on_one_edge_is_refused():
    for second in ({"held": 320.0}, {"film": FILM}, {"flux": 1.0}):
        (text,) = refused(two({"one": {"on": ("left.left",), "held": 300.0}, "two": {"on": (HALF,), **second}}))
        assert '"one"' in text
        assert '"two"' in text


def test_a_steady_job_in_which_a_part_floats_is_refused():
    apart = [region("left", box(0, 0, 1, 1)), region("apart", box(2, 0, 3, 1))]
    texts = refused(docket_of(apart, {"air": {"on": ("left.left",), "film": FILM}}))
    assert len(texts) == 1
    assert '"apart"' in texts[0]
    joined = [region("left", box(0, 0, 1, 1)), region("on it", box(1, 0, 3, 1))]
    assert pose(docket_of(joined, {"air": {"on": ("left.left",), "film": FILM}})).problem.steady
    only_flux = refused(docket_of(joined, {"sun": {"on": ("left.left",), "flux": 1.0}}))
    assert len(only_flux) == 2


def test_a_film_of_nought_holds_no_part_of_a_steady_job():
    part = [region("left", box(0, 0, 1, 1))]
    for given in (
        {"film": {"coefficient": 0.0, "ambient": 300.0}},
        {"radiant": {"emissivity": 0.0, "surroundings": 300.0}},
    ):
        (text,) = refused(docket_of(part, {"air": {"on": ("left.left",), **given}}))
        assert '"left"' in text


def test_a_gauge_outside_is_refused_with_its_place_in_the_dockets_units():
    (text,) = refused(slab_docket(gauges={"lost": (0.5, 0.5)}))
    assert '"lost"' in text
    assert "(0.5, 0.5) m" in text


def test_a_gauge_that_is_not_in_the_region_it_names_is_refused():
    two = docket_of(
        [region("a", box(0, 0, 1, 1)), region("b", box(1, 0, 2, 1))], {"x": {"on": ("a.left",), "held": 300.0}}, end=1.0,
        gauges={"inside": (0.5, 0.5), "border": (1.0, 0.5)},
    )  # fmt: skip
    for gauge, name in (("inside", "a"), ("border", "a"), ("border", "b")):
        pose(two.with_changes({f"gauge.{gauge}.region": name}))
    with pytest.raises(DocketError) as refused:
        pose(two.with_changes({"gauge.inside.region": "b"}))
    (problem,) = refused.value.problems
    assert problem.place == 'gauge "inside", region'
    assert '"a", which lies there' in problem.allowed


def test_all_problems_are_told_at_once():
    texts = refused(two({"a": {"on": ("left.right",), "film": FILM}, "b": {"on": ("right.left",), "flux": 1.0}}))
    assert len(texts) == 2


def test_the_march_lands_where_limits_begin_and_end():
    limits = (
        Limit(name="a", at="g", must="stay below", temperature=900.0, during=(2.5, 7.25)),
        Limit(name="b", at="g", must="reach", temperature=900.0, within=3.75),
    )
    posed = pose(two({"air": {"on": ("left.left",), "film": FILM}}, limits=limits, instants=(1.125,)))
    assert {1.125, 2.5, 3.75, 7.25} <= set(posed.problem.instants)
    assert {b.t for b in posed.problem.breaks()} >= {1.125, 2.5, 3.75, 7.25}


def test_breaks_of_schedules_reach_the_march():
    ambient = {"points": [[0.0, 300.0], [4.0, 350.0], [4.0, 500.0], [6.0, 400.0], [10.0, 400.0]]}
    posed = pose(two({"air": {"on": ("left.left",), "film": {"coefficient": 5.0, "ambient": ambient}}}))
    assert {b.t: b.jump for b in posed.problem.breaks()} == {4.0: True, 6.0: False}


def test_the_narrowest_band_that_is_asked_for():
    assert pose(slab_docket(wanted=Wanted(gauges=2.0))).narrowest == 2.0
    assert pose(slab_docket(wanted=Wanted(gauges=2.0, regions=0.5))).narrowest == 0.5


def test_words_are_in_the_dockets_units():
    docket = slab_docket(units=FileUnits(length="mm", time="min", temperature="degC"))
    assert namer(docket).place(0.012, 0.5) == "(12, 500) mm"
    assert namer(docket).time(90.0) == "1.5 min"
    assert namer(docket).temperature(293.15) == "20.0 °C"


def test_a_void_is_no_region_and_its_rim_can_be_exposed():
    parts = [region("block", box(0, 0, 3, 3)), region("duct", box(1, 1, 2, 2), None)]
    posed = pose(docket_of(parts, {"air": {"on": ("duct.*",), "film": FILM}}, end=1.0, gauges={"g": (0.5, 0.5)}))
    assert posed.plan.region_names == ("block",)
    assert length_of(posed, posed.problem.faces[0]) == pytest.approx(4.0)
    assert np.allclose(posed.gauges.points, [[0.5, 0.5]])
