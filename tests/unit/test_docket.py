"""The docket made in Python: what it takes, what it refuses, what its hash sees."""

import math
import subprocess
import sys
from types import UnionType
from typing import Annotated, Any, Union, get_args, get_origin

import pytest
from pydantic import BaseModel, ValidationError

from fem.docket import (
    Allowance,
    Clock,
    Docket,
    Exposure,
    Film,
    Gauge,
    Limit,
    Radiant,
    Region,
    Section,
    Start,
    Stretch,
    Variant,
    Vertex,
    Wanted,
)
from fem.docket.content import content_hash, is_shelvable
from fem.docket.limits import NEEDED
from fem.errors import DocketError
from fem.laws import Law
from fem.quantities.kinds import KINDS
from fem.quantities.units import FileUnits, Quantity
from fem.schedules.base import OwnKind
from fem.schedules.models import SCHEDULES, Points, Scheduled, law_of
from fem.stock import Stock

SQUARE = ((0.0, 0.0, "bottom"), (1.0, 0.0, "right"), (1.0, 1.0, "top"), (0.0, 1.0, "left"))
BRICK = Stock(conductivity=1.0, density=2000.0, specific_heat=900.0)


def region(**changes):
    return Region(**({"name": "deck", "stock": "brick", "outline": SQUARE} | changes))


def parts(**changes):
    """A sound docket, with some parts changed."""
    return {
        "section": Section(kind="planar", regions=(region(),)),
        "stock": {"brick": BRICK},
        "exposures": (Exposure(name="kiln", on="deck.top", film=Film(coefficient=25.0, ambient=400.0)),),
        "clock": Clock(end=100.0, report_every=10.0),
        "start": Start(everywhere=300.0),
        "gauges": (Gauge(name="web", x=0.5, y=0.5),),
    } | changes


def docket(**changes):
    return Docket(**parts(**changes))


def problems(**changes):
    with pytest.raises(DocketError) as caught:
        docket(**changes)
    return caught.value.problems


def only(**changes):
    (problem,) = problems(**changes)
    assert problem.place
    assert problem.allowed
    assert problem.hint
    return problem


# --- what it takes ----------------------------------------------------------------------------------------------------


def test_docket_is_frozen():
    made = docket()
    with pytest.raises(ValidationError):
        made.title = "x"
    with pytest.raises(ValidationError):
        made.clock.end = 3.0


def test_numbers_are_si_and_text_has_its_unit():
    made = docket(
        section=Section(kind="planar", regions=(region(outline=((0, 0), ("100 cm", 0), (1, "1000 mm"))),)),
        exposures=(Exposure(name="kiln", on="deck.*", held="127 degC"),),
        clock=Clock(end="2 min", report_every="10 s"),
    )
    assert made.section.regions[0].outline[1].x == 1.0
    assert made.exposures[0].held == pytest.approx(400.15)
    assert made.clock.end == 120.0


@pytest.mark.parametrize(
    "ambient",
    [
        400.0,
        "400 K",
        Points(points=((0, 300), (100, 400))),
        {"fire": "standard"},
        lambda t, x, y: 400.0,
        Law(lambda: 4.0),
    ],
)
def test_scheduled_field_takes_every_form(ambient):
    made = docket(exposures=(Exposure(name="kiln", on="deck.top", film=Film(coefficient=25.0, ambient=ambient)),))
    assert isinstance(law_of(made.exposures[0].film.ambient, 0.0, 100.0), Law)


def test_plain_tables_are_taken_like_models():
    as_models = docket()
    as_tables = Docket.make(
        section={
            "kind": "planar",
            "regions": [{"name": "deck", "stock": "brick", "outline": [list(v) for v in SQUARE]}],
        },
        stock={"brick": {"conductivity": 1.0, "density": 2000.0, "specific_heat": 900.0}},
        exposures=[{"name": "kiln", "on": ["deck.top"], "film": {"coefficient": 25.0, "ambient": 400.0}}],
        clock={"end": 100.0, "report_every": 10.0},
        start={"everywhere": 300.0},
        gauges=[{"name": "web", "at": [0.5, 0.5]}],
    )
    assert as_tables == as_models


def test_stock_of_prefers_the_dockets_own():
    made = docket()
    assert made.stock_of(made.section.regions[0]).conductivity.value == 1.0
    made = docket(section=Section(kind="planar", regions=(region(stock="fireclay brick"),)))
    assert made.stock_of(made.section.regions[0]).name == "fireclay brick"


def test_start_of_prefers_the_regions_own():
    made = docket(section=Section(kind="planar", regions=(region(), region(name="b", start=350.0))))
    assert [made.start_of(r) for r in made.section.regions] == [300.0, 350.0]


def test_steady_docket_has_no_clock():
    made = docket(clock=None, start=Start())
    assert made.steady
    assert not docket().steady


def test_arc_of_two_corners_is_an_outline():
    disc = ((0, 0, "rim", {"via": (1, 1)}), (2, 0, "rim", {"via": (1, -1)}))
    assert docket(
        section=Section(kind="planar", regions=(region(outline=disc),)),
        exposures=(Exposure(name="kiln", on="deck.rim", held=300.0),),
    ).section.regions[0].edges() == ("rim",)


def classes(annotation, found):
    """Collect the models that an annotation mentions, and those that they mention."""
    for arg in get_args(annotation):
        classes(arg, found)
    if isinstance(annotation, type) and issubclass(annotation, BaseModel) and annotation not in found:
        found.add(annotation)
        for field in annotation.model_fields.values():
            classes(field.annotation, found)
    return found


def numbers(annotation, marks):
    """Yield the marks of every number in an annotation: those written around it."""
    if get_origin(annotation) is Annotated:
        base, *more = get_args(annotation)
        yield from numbers(base, [*marks, *more])
    elif annotation in (float, int) or annotation is Any:
        yield marks
    else:
        for arg in get_args(annotation):
            yield from numbers(arg, marks if get_origin(annotation) in (Union, UnionType) else [])


MODELS = set().union(*(classes(model, set()) for model in (Docket, *SCHEDULES.values())))
NO_NUMBERS = {"Variant.changes", "Property.law"}
"""Held as they come: in the file's own terms, or a Python function."""


@pytest.mark.parametrize("model", sorted(MODELS, key=lambda m: m.__name__), ids=lambda m: m.__name__)
def test_every_field_has_description_and_every_number_unit_and_bounds(model):
    for name, field in model.model_fields.items():
        where = f"{model.__name__.split('[')[0]}.{name}"
        assert field.description, where
        if where in NO_NUMBERS or field.exclude:
            continue
        for marks in numbers(field.annotation, field.metadata):
            own = [mark for mark in marks if isinstance(mark, Quantity | Scheduled | OwnKind)]
            if own:
                assert isinstance(own[0], OwnKind) or own[0].kind in KINDS, where
                continue
            bounds = {type(mark).__name__ for mark in marks}
            assert {"Ge", "Le"} <= bounds, where
            assert field.json_schema_extra["unit"], where


def test_the_walk_over_the_models_sees_them_all():
    assert {Docket, Clock, Region, Vertex, Exposure, Film, Radiant, Gauge, Limit, Wanted, Stock, Points} <= MODELS
    assert list(numbers(Clock.model_fields["instants"].annotation, [])) == [[Quantity("time")]]
    assert list(numbers(tuple[float, ...], [])) == [[]]


# --- what it refuses: parts -------------------------------------------------------------------------------------------


def refused(model: type[BaseModel], **data):
    with pytest.raises(ValidationError) as caught:
        model(**data)
    return {(line["loc"], line["type"]) for line in caught.value.errors()}


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        ({"outline": ((0, 0), (1, 0))}, "outline"),
        ({"outline": ((0, 0), (1, 0), (1, 0), (0, 1))}, "outline"),
        ({"outline": ((0, 0), (1, 0), (0, 1), (0, 0))}, "outline"),
        ({"outline": ((0, 0, "a.b"), (1, 0), (0, 1))}, "outline"),
        ({"outline": ((0, 0, "a", {"via": (1,)}), (1, 0), (0, 1))}, "outline"),
        ({"outline": ((0, 0, "a", 3), (1, 0), (0, 1))}, "outline"),
        ({"outline": ((0,), (1, 0), (0, 1))}, "outline"),
        ({"outline": ((0, math.nan), (1, 0), (0, 1))}, "outline"),
        ({"name": "a.b"}, "name"),
        ({"name": "a*"}, "name"),
        ({"name": ""}, "name"),
        ({"name": " a"}, "name"),
        ({"name": 'a"b'}, "name"),
        ({"name": "a\nb"}, "name"),
        ({"name": "anywhere"}, "name"),
        ({"name": "x" * 81}, "name"),
        ({"stock": None, "source": 3.0}, "source"),
        ({"stock": None, "start": 3.0}, "start"),
        ({"void": True}, "void"),
        ({"void": "yes"}, "void"),
        ({"colour": "red"}, "colour"),
        ({"start": lambda t: t}, "start"),
        ({"start": -1.0}, "start"),
    ],
)
def test_region_refuses(changes, key):
    found = refused(Region, **({"name": "deck", "stock": "brick", "outline": SQUARE} | changes))
    assert {loc[0] for loc, _ in found} == {key}


def test_region_without_stock_says_how_to_draw_a_hole():
    with pytest.raises(ValidationError) as caught:
        Region(name="a", outline=SQUARE)
    assert "void" in caught.value.errors()[0]["ctx"]["hint"]


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        ({}, "on"),
        ({"held": 300.0, "flux": 1.0}, "held"),
        ({"held": 300.0, "film": Film(coefficient=1.0, ambient=300.0)}, "held"),
        ({"held": 300.0, "radiant": Radiant(emissivity=1.0, surroundings=300.0)}, "held"),
        ({"flux": 1.0, "on": ()}, "on"),
        ({"flux": 1.0, "on": "deck"}, "on"),
        ({"flux": 1.0, "on": "deck.top.left"}, "on"),
        ({"flux": 1.0, "on": "deck."}, "on"),
        ({"flux": 1.0, "on": (3,)}, "on"),
        ({"flux": 1.0, "on": {"region": "deck", "start": (0, 0), "end": (0, 0)}}, "on"),
        ({"flux": 1.0, "on": {"region": "deck", "start": (0, 0)}}, "on"),
        ({"flux": math.inf}, "flux"),
        ({"fluxx": 1.0, "flux": 1.0}, "fluxx"),
        ({"film": {"coefficient": -1.0, "ambient": 300.0}}, "film"),
        ({"radiant": {"emissivity": 1.1, "surroundings": 300.0}}, "radiant"),
        ({"radiant": {"emissivity": 0.9}}, "radiant"),
    ],
)
def test_exposure_refuses(changes, key):
    found = refused(Exposure, **({"name": "kiln", "on": "deck.top"} | changes))
    assert {loc[0] for loc, _ in found} == {key}


@pytest.mark.parametrize(
    ("data", "key"),
    [
        ({"end": 0.0, "report_every": 1.0}, "end"),
        ({"begin": 5.0, "end": 4.0, "report_every": 1.0}, "end"),
        ({"end": 10.0, "report_every": 0.0}, "report_every"),
        ({"end": 10.0, "report_every": 1e-6}, "report_every"),
        ({"end": 10.0}, "report_every"),
        ({"end": 10.0, "report_every": 1.0, "instants": (11.0,)}, "instants"),
        ({"end": 10.0, "report_every": 1.0, "steady": True}, "steady"),
    ],
)
def test_clock_refuses(data, key):
    assert {loc[0] for loc, _ in refused(Clock, **data)} == {key}


LIMIT = {
    "reach": {"temperature": 350.0, "within": 50.0},
    "stay below": {"temperature": 350.0, "during": (10.0, 20.0)},
    "stay above": {"temperature": 280.0},
    "hold above": {"temperature": 350.0, "at_least": 20.0},
    "heat slower than": {"rate": 1.0, "over": 20.0},
    "cool slower than": {"rate": 1.0},
    "differ less than": {"other": "rim", "below": 20.0},
}


@pytest.mark.parametrize("must", LIMIT)
def test_limit_needs_its_keys_and_no_others(must):
    limit = Limit(name="l", at="web", must=must, **LIMIT[must])
    assert limit.sentence(FileUnits())
    for key in NEEDED[must]:
        rest = {k: v for k, v in LIMIT[must].items() if k != key}
        assert ((key,), "refused") in refused(Limit, name="l", at="web", must=must, **rest)
    stranger = "rate" if must not in ("heat slower than", "cool slower than") else "temperature"
    assert refused(Limit, name="l", at="web", must=must, **LIMIT[must], **{stranger: 5.0}) == {((stranger,), "refused")}
    assert refused(Limit, name="l", at="web", must=must, **(LIMIT[must] | {stranger: None}), nonsense=1)


def test_limit_table_is_complete():
    assert set(get_args(Limit.model_fields["must"].annotation)) == set(NEEDED) == set(LIMIT)


def test_limit_sentences_read():
    units = FileUnits("mm", "min", "degC")
    below = Limit(name="l", at="web", must="stay below", temperature="350 degC")
    assert below.sentence(units) == '"web" must stay below 350 °C'
    assert below.sentence(FileUnits("in", "h", "degF")) == '"web" must stay below 662 °F'
    reach = Limit(name="l", at="anywhere", must="reach", temperature=373.15, within=60.0)
    assert reach.sentence(units) == "anywhere must reach 100 °C within 1 min"
    rate = Limit(name="l", at="web", must="heat slower than", rate="5 K/min")
    assert rate.sentence(units) == '"web" must heat slower than 5 K/min'


def test_limit_refuses_itself_and_times_that_go_back():
    assert refused(Limit, name="l", at="web", must="differ less than", other="web", below=3.0) == {
        (("other",), "refused")
    }
    found = refused(Limit, name="l", at="web", must="stay below", temperature=3.0, during=(2.0, 1.0))
    assert found == {(("during",), "refused")}
    assert refused(Limit, name="l", at="web", must="stay blow", temperature=3.0)


def test_other_parts_refuse():
    assert refused(Gauge, name="g", at=[1]) == {(("at",), "refused")}
    assert refused(Gauge, name="g") == {(("at",), "refused")}
    assert refused(Gauge, name="g", x=1.0, y=1.0, band=0.0)
    assert refused(Wanted, gauges=0.0)
    assert refused(Wanted, heat="3 W")
    assert refused(Allowance, cells=5)
    assert refused(Allowance, cells=1e5)
    assert refused(Allowance, seconds=0)
    assert refused(Variant, name="v", changes={})
    assert refused(Start, regions={"deck": 3.0})
    assert refused(Stretch, region="a", start=(0, 0), end=(0, 0))
    assert refused(Section, kind="round", regions=(region(),))
    assert refused(Section, kind="planar", regions=())
    assert refused(Section, kind="planar", regions=(region(stock=None),))
    assert refused(Section, kind="planar", regions=(region(),), gap_tolerance=0.0)
    left = region(outline=((-1e-9, 0), (1, 0), (1, 1)))
    assert refused(Section, kind="revolution", regions=(left,))
    assert Section(kind="planar", regions=(left,))
    assert refused(Vertex, x=1)


# --- what it refuses: links -------------------------------------------------------------------------------------------


def test_unknown_stock_names_the_nearest():
    problem = only(section=Section(kind="planar", regions=(region(stock="brik"),)))
    assert problem.place == 'region "deck", stock'
    assert '"brick"' in problem.hint
    assert "fireclay" in only(section=Section(kind="planar", regions=(region(stock="fireclay brik"),))).hint


def test_unknown_region_or_edge_names_the_nearest_and_lists_them():
    problem = only(exposures=(Exposure(name="kiln", on="dek.top", held=300.0),))
    assert (problem.place, problem.hint) == ('exposure "kiln", on, item 1', 'did you mean "deck"?')
    problem = only(exposures=(Exposure(name="kiln", on=("deck.bottom", "deck.tpo"), held=300.0),))
    assert problem.place == 'exposure "kiln", on, item 2'
    assert problem.allowed.endswith('"top", "bottom", "right", "left", "*"')
    assert '"top"' in problem.hint
    stretch = Stretch(region="dekc", start=(0, 0), end=(1, 0))
    assert '"deck"' in only(exposures=(Exposure(name="kiln", on=stretch, held=300.0),)).hint


@pytest.mark.parametrize("on", [("deck.top", "deck.top"), ("deck.*", "deck.top"), ("deck.top", "deck.*")])
def test_edge_twice_in_one_exposure(on):
    assert "once" in only(exposures=(Exposure(name="kiln", on=on, flux=1.0),)).allowed


@pytest.mark.parametrize("on", ["deck.top", "deck.*"])
def test_held_with_another_exposure_on_the_same_edge(on):
    film = Exposure(name="film", on="deck.top", film=Film(coefficient=1.0, ambient=300.0))
    held = Exposure(name="held", on=on, held=300.0)
    for pair in ((film, held), (held, film)):
        assert "held" in only(exposures=pair).hint
    flux = Exposure(name="flux", on=on, flux=1.0)
    assert docket(exposures=(film, flux))


def test_names_are_unique():
    twice = (region(), region())
    assert only(section=Section(kind="planar", regions=twice)).place == 'region "deck", name'
    gauge = Gauge(name="web", x=0.5, y=0.5)
    assert only(gauges=(gauge, gauge)).place == 'gauge "web", name'
    kiln = Exposure(name="kiln", on="deck.top", flux=1.0)
    assert only(exposures=(kiln, kiln)).place == 'exposure "kiln", name'
    limit = Limit(name="l", at="web", must="stay below", temperature=300.0)
    assert only(limits=(limit, limit)).place == 'limit 2 "l", name'
    variant = Variant(name="v", changes={"clock.end": 50.0})
    assert only(variants=(variant, variant)).place == 'variant "v", name'
    assert only(gauges=(Gauge(name="deck", x=0.5, y=0.5),)).place == 'gauge "deck", name'


def test_gauge_of_no_region():
    assert '"deck"' in only(gauges=(Gauge(name="web", x=0.5, y=0.5, region="dek"),)).hint
    hole = region(name="hole", stock=None)
    section = Section(kind="planar", regions=(region(), hole))
    assert (
        only(section=section, gauges=(Gauge(name="web", x=0.5, y=0.5, region="hole"),)).place == 'gauge "web", region'
    )


def test_limit_of_no_gauge():
    def limits(**data):
        return (Limit(name="l", must="stay below", temperature=300.0, **data),)

    assert docket(limits=limits(at="web"))
    assert docket(limits=limits(at="deck"))
    assert docket(limits=limits(at="anywhere"))
    assert '"web"' in only(limits=limits(at="wbe")).hint
    rate = (Limit(name="l", at="deck", must="heat slower than", rate=1.0),)
    assert "gauges" in only(limits=rate).allowed
    other = (Limit(name="l", at="web", must="differ less than", other="rim", below=1.0),)
    assert only(limits=other).place == 'limit 1 "l", other'


def test_limit_times_fit_the_clock():
    for must, data, key in [
        ("reach", {"temperature": 300.0, "within": 101.0}, "within"),
        ("hold above", {"temperature": 300.0, "at_least": 101.0}, "at_least"),
        ("heat slower than", {"rate": 1.0, "over": 101.0}, "over"),
        ("stay below", {"temperature": 300.0, "during": (50.0, 101.0)}, "during"),
        ("stay below", {"temperature": 300.0, "during": (-1.0, 50.0)}, "during"),
    ]:
        assert only(limits=(Limit(name="l", at="web", must=must, **data),)).place == f'limit 1 "l", {key}'


def test_steady_docket_refuses_times():
    steady = {"clock": None, "start": Start()}
    assert docket(**steady, limits=(Limit(name="l", at="web", must="reach", temperature=300.0),))
    for must, data in [("reach", {"temperature": 3.0, "within": 1.0}), ("heat slower than", {"rate": 1.0})]:
        assert "steady" in only(**steady, limits=(Limit(name="l", at="web", must=must, **data),)).allowed
    for held in (Points(points=((0, 1), (1, 2))), lambda t: 300.0, {"fire": "standard"}):
        assert "steady" in only(**steady, exposures=(Exposure(name="k", on="deck.top", held=held),)).allowed
    assert docket(**steady, exposures=(Exposure(name="k", on="deck.top", held=lambda x: 300.0),))


@pytest.mark.parametrize(
    ("points", "says"),
    [(((10, 300), (200, 400)), "before"), (((0, 300), (99, 400)), "after"), (((1, 300), (2, 400)), "")],
)
def test_schedule_must_cover_the_clock(points, says):
    found = problems(exposures=(Exposure(name="k", on="deck.top", held=Points(points=points)),))
    assert len(found) == (1 if says else 2)
    assert f'{says} = "hold"' in found[0].hint or not says
    held = Points(points=points, before="hold", after="hold")
    assert docket(exposures=(Exposure(name="k", on="deck.top", held=held),))


def test_transient_docket_needs_a_start():
    assert only(start=Start()).place == 'region "deck", start'
    hole = region(name="hole", stock=None)
    assert docket(section=Section(kind="planar", regions=(region(start=300.0), hole)), start=Start())


def test_messages_speak_the_dockets_units():
    held = Points(points=((0, 300), (60, 400)))
    problem = only(units=FileUnits("mm", "min", "degC"), exposures=(Exposure(name="k", on="deck.top", held=held),))
    assert "1 min" in problem.allowed


def test_all_problems_at_once():
    found = problems(
        section={"kind": "plan", "regions": [{"name": "deck", "stock": "brik", "outline": [*SQUARE[:3], (0, "1 kg")]}]},
        exposures=[{"name": "kiln", "on": ["deck.topp"], "film": {"coefficient": "a", "ambient": {"log": "no.csv"}}}],
        clock={"end": 100.0},
        gauges=[{"name": "web", "att": [0, 0]}],
        limits=[{"name": "l", "at": "wbe", "must": "stay below"}],
        nonsense=1,
    )
    places = [p.place for p in found]
    for place in (
        "section, kind",
        'region "deck", corner 4, y',
        'region "deck", stock',
        'exposure "kiln", on, item 1',
        'exposure "kiln", film.coefficient',
        'exposure "kiln", film.ambient.time',
        "clock, report_every",
        'gauge "web", att',
        'gauge "web", at',
        'limit 1 "l", at',
        'limit 1 "l", temperature',
        "nonsense",
    ):
        assert place in places, place
    assert len(places) == len(set(found))


# --- variants ---------------------------------------------------------------------------------------------------------


def variant(changes, **more):
    return docket(variants=(Variant(name="v", changes=changes),), **more)


def test_variant_changes_by_path():
    outline = [[0, 0, "bottom"], [2, 0], [2, "1 m", "top"]]
    changes = {
        "region.deck.outline": outline,
        "stock.brick.density": "2.1 g/cm3",
        "exposure.kiln.film.coefficient": 30.0,
        "clock.instants": [50.0],
        "gauge.web.at": [1.0, 0.5],
    }
    made = variant(changes).variant("v")
    assert [v.x for v in made.section.regions[0].outline] == [0, 2, 2]
    assert made.stock["brick"].density.value == 2100.0
    assert made.exposures[0].film.coefficient == 30.0
    assert made.clock.instants == (50.0,)
    assert (made.gauges[0].x, made.variants) == (1.0, ())


def test_changes_by_path_keep_title_and_variants():
    known = variant({"start.everywhere": 300.0}, title="Deck")
    other = known.with_changes({"start.everywhere": 310.0})
    assert other.start.everywhere == 310.0
    assert (other.title, other.variants) == ("Deck", known.variants)
    assert known.variant("v").variants == ()
    with pytest.raises(DocketError, match="nowhere"):
        known.with_changes({"nowhere.at": 1})


def test_variant_keeps_callables():
    f = lambda t: 400.0  # noqa: E731
    kiln = Exposure(name="kiln", on="deck.top", film=Film(coefficient=25.0, ambient=f))
    made = variant({"exposure.kiln.film.coefficient": 30.0}, exposures=(kiln,)).variant("v")
    assert made.exposures[0].film.ambient is f


def test_variant_of_a_stock_whose_name_has_a_dot():
    section = Section(kind="planar", regions=(region(stock="steel 1.2"),))
    made = variant({"stock.steel 1.2.density": 7000.0}, section=section, stock={"steel 1.2": BRICK}).variant("v")
    assert made.stock["steel 1.2"].density.value == 7000.0


@pytest.mark.parametrize(
    ("path", "says"),
    [
        ("region.dek.outline", '"deck"'),
        ("regio.deck.outline", '"region"'),
        ("exposure.kiln.flim.coefficient", '"film"'),
        ("exposure.kiln.film.coeficient", '"coefficient"'),
        ("stock.brik.density", '"brick"'),
        ("nonsense", "use one of these"),
        ("", ""),
        ("clock.end.more", ""),
    ],
)
def test_variant_path_that_leads_nowhere(path, says):
    with pytest.raises(DocketError) as caught:
        variant({path: 3})
    (problem,) = caught.value.problems
    assert problem.place.startswith('variant "v"')
    assert says in problem.hint


def test_variant_value_that_is_refused():
    with pytest.raises(DocketError) as caught:
        variant({"clock.end": "50 kg", "exposure.kiln.on": "deck.topp"})
    text = str(caught.value)
    assert "clock, end" in text
    assert '"top"' in text


def test_unknown_variant():
    with pytest.raises(DocketError):
        docket().variant("v")


# --- hash -------------------------------------------------------------------------------------------------------------


MOVES = [
    {"section": Section(kind="revolution", regions=(region(),))},
    {"section": Section(kind="planar", regions=(region(outline=((0, 0, "top"), (1, 0), (1, 1.0000000000000002))),))},
    {"section": Section(kind="planar", regions=(region(source=3.0),))},
    {"section": Section(kind="planar", regions=(region(start=300.0),))},
    {"section": Section(kind="planar", regions=(region(stock="fireclay brick"),))},
    {"stock": {"brick": Stock(conductivity=1.0, density=2001.0, specific_heat=900.0)}},
    {"stock": {"brick": Stock(conductivity=1.0, density=2000.0, specific_heat=900.0, range=(300.0, 400.0))}},
    {"exposures": ()},
    {"exposures": (Exposure(name="kiln", on="deck.top", film=Film(coefficient=25.0, ambient=400.5)),)},
    {"exposures": (Exposure(name="kiln", on="deck.left", film=Film(coefficient=25.0, ambient=400.0)),)},
    {"exposures": (Exposure(name="oven", on="deck.top", film=Film(coefficient=25.0, ambient=400.0)),)},
    {"clock": Clock(end=101.0, report_every=10.0)},
    {"clock": Clock(end=100.0, report_every=5.0)},
    {"clock": Clock(end=100.0, report_every=10.0, instants=(3.0,))},
    {"start": Start(everywhere=301.0)},
    {"gauges": (Gauge(name="web", x=0.5, y=0.6),)},
    {"limits": (Limit(name="l", at="web", must="stay below", temperature=300.0),)},
    {"wanted": Wanted(gauges=2.0)},
    {"allowance": Allowance(seconds=10.0)},
]


@pytest.mark.parametrize("changes", MOVES)
def test_hash_sees_what_moves_a_number(changes):
    assert content_hash(docket(**changes)) != content_hash(docket())


@pytest.mark.parametrize(
    "changes",
    [
        {"title": "x"},
        {"units": FileUnits("mm", "min", "degF")},
        {"sources": {"film": "a table"}},
        {"variants": (Variant(name="v", changes={"clock.end": 50.0}),)},
        {"stock": {"brick": BRICK, "other": BRICK}},
        {"stock": {"brick": BRICK.model_copy(update={"source": "a sheet", "note": "x"})}},
        {"clock": Clock(begin=-0.0, end=100.0, report_every=10.0)},
        {"gauges": (Gauge(name="web", x="50 cm", y="500 mm"),)},
    ],
)
def test_hash_does_not_see_what_moves_none(changes):
    assert content_hash(docket(**changes)) == content_hash(docket())


def test_hash_is_the_same_in_another_process():
    code = (
        "import importlib.util as u\n"
        f"s = u.spec_from_file_location('t', {__file__!r}); m = u.module_from_spec(s); s.loader.exec_module(m)\n"
        "print(m.content_hash(m.docket()))"
    )
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert out.stdout.strip() == content_hash(docket())
    assert len(content_hash(docket())) == 64


def test_docket_with_a_callable_is_not_shelvable():
    f = lambda t: 400.0  # noqa: E731
    made = docket(exposures=(Exposure(name="k", on="deck.top", held=f),))
    assert content_hash(made).startswith("callable-")
    assert content_hash(made) == content_hash(docket(exposures=(Exposure(name="k", on="deck.top", held=f),)))
    assert not is_shelvable(made)
    assert is_shelvable(docket())
    stock = Stock(conductivity=lambda T: 1.0 + 0.0 * T, density=2000.0, specific_heat=900.0)
    assert not is_shelvable(docket(stock={"brick": stock}))


def test_import_is_quick():
    code = "import time; t = time.perf_counter(); import fem.docket.models; print(time.perf_counter() - t)"
    code += "; import sys; assert 'pint' not in sys.modules"
    runs = [subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True) for _ in range(2)]
    assert min(float(run.stdout) for run in runs) < 1.2  # 0.25 s on an idle machine; the rest is for a loaded one
