"""Docket files: read, written, updated with their comments kept, packed; and every refusal of a file."""

import io
import stat
import time
import zipfile
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.docket import (
    Clock,
    Docket,
    Exposure,
    Film,
    Gauge,
    Limit,
    Region,
    Section,
    Start,
    Variant,
    Vertex,
    Wanted,
)
from fem.docket import archive as docket_zip
from fem.docket.content import content_hash
from fem.docket.file import logs_of, pack, read_docket, read_text, to_text, update_text, write_docket
from fem.errors import DocketError
from fem.quantities.units import LENGTHS, TEMPERATURES, TIMES, FileUnits
from fem.schedules.log_folder import LogFolder
from fem.schedules.models import Firing, Points
from fem.stock import Stock

DECK = """\
# Deck on a steel beam, drawn from the works' sketch
[docket]
format = 1
title = "Deck on a steel beam"
length = "mm"
time = "min"
temperature = "degC"

[section]
kind = "planar"   # per metre of deck

[[region]]
name = "deck"
stock = "fireclay brick"
outline = [ [0, 0, "bottom"], [500, 0, "right"], [500, 60, "top"], [0, 60, "left"] ]   # mm

[[region]]
name = "beam"
stock = "my brick"
outline = [ [0, "-10 cm", "bottom"], [500, -100, "right", { via = [520.5, -50] }], [500, 0], [0, 0] ]
start = "300 K"
source = { points = [[0, 0], [10, "5 kW/m3"], [10, 0]], after = "hold" }

[[region]]
name = "duct"
void = true
outline = [ [100, 10, "wall"], [120, 10, "wall"], [120, 30, "wall"], [100, 30, "wall"] ]

# our own
[stock."my brick"]
conductivity = [[20, 1.1], [800, 1.4]]
density = 2000
specific_heat = 880    # typed
range = [0, 1400]
source = "supplier's sheet"

[[exposure]]
name = "kiln"
on = ["deck.top", "deck.right"]
film = { coefficient = 25, ambient = { log = "kiln.csv", time = "minute", column = "kiln", thin = 0.5 } }
radiant = { emissivity = 0.85, surroundings = { log = "kiln.csv", time = "minute", column = "kiln" } }

[[exposure]]
name = "below"
on = { region = "beam", start = [0, -100], end = [500, -100] }

[exposure.film]
coefficient = { over_temperature = [[20, 4], [500, 9]], outside = "hold" }
ambient = { firing = { start = 20, steps = [ { to = 90, rate = "100 K/h" }, { hold = "2 h" } ] }, after = "hold" }

[[exposure]]
name = "duct"
on = "duct.*"
film = { coefficient = 10, ambient = { daily = [[0, 18], ["15 h", 32]] } }

[clock]
end = 120
report_every = 5

[start]
everywhere = 20

[[gauge]]
name = "beam web"   # welded on
at = [250, -50]

[[limit]]
name = "steel keeps its strength"
at = "beam web"
must = "stay below"
temperature = "350 degC"

[wanted]
gauges = 1

[sources]
film = "EN 1991-1-2, 3.2.1"

[[variant]]
name = "heavier"
[variant.changes]
"stock.my brick.density" = 2100
"exposure.kiln.film.coefficient" = "30 W/m2K"
"""

LOG = "# logger 7\nminute;kiln\n" + "".join(f"{i};{20 + 3 * i},5\n" for i in range(121))


@pytest.fixture
def deck(tmp_path):
    (tmp_path / "kiln.csv").write_text(LOG)
    path = tmp_path / "deck.docket.toml"
    path.write_text(DECK)
    return path


def problems(text, folder=None):
    with pytest.raises(DocketError) as caught:
        read_text(text, logs=LogFolder(folder), file="deck.docket.toml")
    assert all(p.file == "deck.docket.toml" and p.place and p.allowed and p.hint for p in caught.value.problems)
    return {p.place: p for p in caught.value.problems}


# --- reading ----------------------------------------------------------------------------------------------------------


def test_file_is_read_into_si(deck):
    docket = read_docket(deck)
    beam = docket.section.regions[1]
    assert (docket.title, docket.units) == ("Deck on a steel beam", FileUnits("mm", "min", "degC"))
    assert [(v.x, v.y, v.edge) for v in beam.outline] == [
        (0, -0.1, "bottom"),
        (0.5, -0.1, "right"),
        (0.5, 0, None),
        (0, 0, None),
    ]
    assert beam.outline[1].via == (0.5205, -0.05)
    assert beam.source.points == ((0, 0), (600, 5000), (600, 0))
    assert beam.start == 300.0
    assert docket.section.regions[2].stock is None
    assert docket.stock["my brick"].conductivity.table == ((293.15, 1.1), (1073.15, 1.4))
    assert (docket.clock.begin, docket.clock.end, docket.clock.report_every) == (0.0, 7200.0, 300.0)
    assert docket.limits[0].temperature == 623.15
    assert docket.exposures[2].film.ambient.daily == ((0, 291.15), (54000, 305.15))
    assert docket.exposures[1].on[0].region == "beam"
    assert len(logs_of(docket)) == 2


def test_log_is_read_thinned_and_converted(deck):
    docket = read_docket(deck)
    thinned, whole = docket.exposures[0].film.ambient, docket.exposures[0].radiant.surroundings
    assert len(whole.kept()) == 121
    assert thinned.kept().tolist() == [0, 120]  # the log is straight
    law = whole.law(0, 7200)
    assert law(t=0.0) == 20.5 + 273.15
    assert law(t=90.0) == pytest.approx(20.5 + 4.5 + 273.15)
    assert (thinned.unit, thinned.time_unit) == ("degC", "min")


def test_hash_sees_what_a_log_holds_and_not_its_name(deck):
    first = content_hash(read_docket(deck))
    (deck.parent / "other.csv").write_text(LOG)
    deck.write_text(DECK.replace("kiln.csv", "other.csv"))
    assert content_hash(read_docket(deck)) == first
    (deck.parent / "other.csv").write_text(LOG.replace("50;170,5", "50;170,6"))
    assert content_hash(read_docket(deck)) != first
    (deck.parent / "other.csv").write_text(LOG.replace("\n0;", "\n-1;"))
    assert content_hash(read_docket(deck)) != first


def test_log_can_be_moved_on_the_clock(deck):
    text = DECK.replace("thin = 0.5 }", 'starts_at = -10, after = "hold" }')
    law = read_text(text, logs=LogFolder(deck.parent)).exposures[0].film.ambient.law(0, 7200)
    assert law(t=0.0) == pytest.approx(20.5 + 30 + 273.15)
    assert law(t=7200.0) == pytest.approx(380.5 + 273.15)


def test_steady_file():
    text = DECK.split("[[exposure]]")[0].replace("after", "before")
    text = text.replace('source = { points = [[0, 0], [10, "5 kW/m3"], [10, 0]], before = "hold" }\n', "")
    assert read_text(text + "[clock]\nsteady = true\n", logs=LogFolder()).clock is None


def test_reading_is_quick(tmp_path):
    parts = [DECK.split("[[region]]")[0], "[clock]\nend = 720\nreport_every = 5\n[start]\neverywhere = 20\n"]
    for i in range(20):
        x = 100 * i
        parts.append(
            f'[[region]]\nname = "r{i}"\nstock = "fireclay brick"\n'
            f'outline = [[{x}, 0, "a"], [{x + 50}, 0, "b"], [{x + 50}, 60.5, "c"], [{x}, 60.5]]\n'
            f'[[exposure]]\nname = "e{i}"\non = ["r{i}.a", "r{i}.c"]\n'
            "film = { coefficient = 25, ambient = { points = [[0, 20], [100, 300.5], [720, 20]] } }\n"
        )
    path = tmp_path / "big.docket.toml"
    path.write_text("".join(parts))
    read_docket(path)  # pint and the library of stock are loaded once a process
    begin = time.perf_counter()
    read_docket(path)
    assert time.perf_counter() - begin < 0.3


# --- writing ----------------------------------------------------------------------------------------------------------


def test_new_text_reads_back_the_same(deck):
    docket = read_docket(deck)
    assert read_text(to_text(docket), logs=docket.logs) == docket


def test_unchanged_text_stays_as_it_is(deck):
    docket = read_docket(deck)
    assert update_text(DECK, docket) == DECK
    write_docket(docket, deck)
    assert deck.read_text() == DECK


def test_changed_values_keep_comments_and_layout(deck):
    docket = read_docket(deck)
    gauges = (docket.gauges[0].model_copy(update={"y": -0.025}), Gauge(name="deck top", x=0.25, y=0.06))
    stock = docket.stock["my brick"]
    heavier = stock.model_copy(update={"density": stock.density.model_copy(update={"value": 2150.0})})
    changed = docket.model_copy(update={"gauges": gauges, "stock": {"my brick": heavier}, "wanted": Wanted(gauges=0.5)})
    write_docket(changed, deck)
    text = deck.read_text()
    assert read_docket(deck) == changed
    for kept in DECK.splitlines():
        if "#" in kept:
            assert kept in text
    lost = [line for line in DECK.splitlines() if line not in text.splitlines()]
    assert lost == ["density = 2000", "at = [250, -50]", "gauges = 1"]
    assert 'coefficient = 25, ambient = { log = "kiln.csv"' in text


def test_only_the_key_that_changed_is_written_anew(deck):
    docket = read_docket(deck)
    deck_region, beam, duct = docket.section.regions
    regions = (deck_region, beam.model_copy(update={"start": 310.0}), duct)
    section = docket.section.model_copy(update={"regions": regions})
    limit = docket.limits[0].model_copy(update={"during": (0.0, 60.0)})
    text = update_text(DECK, docket.model_copy(update={"section": section, "limits": (limit,)}))
    lost = [line for line in DECK.splitlines() if line not in text.splitlines()]
    assert lost == ['start = "300 K"']
    assert "start = 36.85" in text
    assert "during = [0, 1]" in text


def test_removed_parts_go(deck):
    docket = read_docket(deck)
    changed = docket.model_copy(
        update={"limits": (), "variants": (), "exposures": docket.exposures[::-1], "sources": {}}
    )
    text = update_text(DECK, changed)
    assert read_text(text, logs=docket.logs) == changed
    assert "[[limit]]" not in text
    assert "[sources]" not in text
    assert text.index('name = "duct"\non') < text.index('name = "kiln"')


@pytest.mark.parametrize("units", [FileUnits(), FileUnits("in", "h", "degF"), FileUnits("cm", "s", "K")])
def test_units_of_a_file_can_change(deck, units):
    docket = read_docket(deck)
    changed = docket.model_copy(update={"units": units, "variants": ()})
    text = update_text(DECK, changed)
    assert read_text(text, logs=docket.logs) == changed
    assert "# welded on" in text
    assert content_hash(read_text(text, logs=docket.logs)) == content_hash(docket)
    fresh = read_text(to_text(changed), logs=docket.logs)
    assert content_hash(fresh) == content_hash(docket)


def test_writing_is_refused_where_the_logs_are_not(deck, tmp_path):
    docket = read_docket(deck)
    other = tmp_path / "other"
    other.mkdir()
    with pytest.raises(DocketError) as caught:
        write_docket(docket, other / "deck.docket.toml")
    assert "kiln.csv" in str(caught.value)
    (other / "kiln.csv").write_text(LOG.replace("20,5", "21,5"))
    with pytest.raises(DocketError) as caught:
        write_docket(docket, other / "deck.docket.toml")
    assert "numbers" in str(caught.value)
    assert [p.name for p in other.iterdir()] == ["kiln.csv"]
    (other / "kiln.csv").write_text(LOG)
    write_docket(docket, other / "deck.docket.toml")
    assert read_docket(other / "deck.docket.toml") == docket


def test_callable_cannot_be_written(deck):
    docket = read_docket(deck)
    kiln = docket.exposures[0].model_copy(
        update={"radiant": None, "film": Film(coefficient=3.0, ambient=lambda t: 300.0)}
    )
    with pytest.raises(DocketError) as caught:
        to_text(docket.model_copy(update={"exposures": (kiln,)}))
    assert "data only" in str(caught.value)


def test_bad_name_is_refused(deck, tmp_path):
    with pytest.raises(DocketError):
        write_docket(read_docket(deck), tmp_path / "deck.toml")


def test_failed_write_leaves_the_old_file(deck, monkeypatch):
    docket = read_docket(deck)

    def fail(*_):
        raise OSError("disk full")

    monkeypatch.setattr("os.fsync", fail)
    with pytest.raises(OSError, match="disk full"):
        write_docket(docket.model_copy(update={"title": "x"}), deck)
    assert deck.read_text() == DECK
    assert sorted(p.name for p in deck.parent.iterdir()) == ["deck.docket.toml", "kiln.csv"]


# --- variants ---------------------------------------------------------------------------------------------------------


def test_variant_of_a_file(deck):
    docket = read_docket(deck)
    heavier = docket.variant("heavier")
    assert heavier.stock["my brick"].density.value == 2100.0
    assert heavier.exposures[0].film.coefficient == 30.0
    assert heavier.exposures[0].film.ambient == docket.exposures[0].film.ambient
    assert content_hash(heavier) != content_hash(docket)
    assert read_text(to_text(heavier), logs=docket.logs) == heavier


def test_variant_may_read_another_column(deck):
    (deck.parent / "kiln.csv").write_text("minute;kiln;door\n0;20;30\n200;20;40\n")
    text = DECK.replace('"stock.my brick.density" = 2100', '"exposure.kiln.film.ambient.column" = "door"')
    made = read_text(text, logs=LogFolder(deck.parent)).variant("heavier")
    assert made.exposures[0].film.ambient.law(0, 7200)(t=0.0) == 303.15


# --- refusals of a file -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("old", "new", "place", "says"),
    [
        ("format = 1", "format = 2", "docket, format", "update the program"),
        ("format = 1", "format = 0", "docket, format", "format = 1"),
        ("format = 1", 'format = "1"', "docket, format", "format = 1"),
        ("format = 1", "format = true", "docket, format", "format = 1"),
        ("format = 1\n", "", "docket, format", "format = 1"),
        ("[docket]", "[dockt]", "docket", "[docket]"),
        ('length = "mm"', 'length = "km"', "docket, length", '"mm"'),
        ('length = "mm"\n', "", "docket, length", '"mm"'),
        ('time = "min"', 'tiem = "min"', "docket, tiem", '"time"'),
        ("[section]", "[secton]", "secton", '"section"'),
        ('kind = "planar"', 'kind = "plannar"', "section, kind", '"planar"'),
        ('stock = "fireclay brick"', 'stok = "fireclay brick"', 'region "deck", stok', '"stock"'),
        ("[500, 60, ", '[500, "60 kg", ', 'region "deck", corner 3, y', "kg"),
        ("{ via = [520.5, -50] }", '{ via = [520.5, "x"] }', 'region "beam", edge 2, via, item 2', "number"),
        ("void = true", "void = false", 'region "duct", void', "drop"),
        ('[10, "5 kW/m3"]', '[-1, "5 kW/m3"]', 'region "beam", source.points, row 2, column 1', "sort"),
        ("conductivity = [[20,", "conductivty = [[20,", 'stock "my brick", conductivty', '"conductivity"'),
        ("density = 2000", 'density = "2000 W"', 'stock "my brick", density.value', "W"),
        ("density = 2000", "density = { valu = 2000 }", 'stock "my brick", density.valu', '"value"'),
        ("range = [0, 1400]", "range = [1400, 0]", 'stock "my brick"', "swap"),
        ('"deck.top", ', '"deck.tpo", ', 'exposure "kiln", on, item 1', '"top"'),
        ("emissivity = 0.85", "emisivity = 0.85", 'exposure "kiln", radiant.emisivity', '"emissivity"'),
        ("emissivity = 0.85", "emissivity = 1.85", 'exposure "kiln", radiant.emissivity', "check"),
        ('column = "kiln", thin', 'column = "kil", thin', 'exposure "kiln", film.ambient, kiln.csv, header', '"kiln"'),
        ('25, ambient = { log = "k', '25, ambient = { log = "kk', 'exposure "kiln", film.ambient.log', '"kiln.csv"'),
        ("thin = 0.5", 'unit = "W"', 'exposure "kiln", film.ambient.unit', "quotes"),
        ("thin = 0.5", "scale = 2", 'exposure "kiln", film.ambient', "scale"),
        ("thin = 0.5", "thin = 0", 'exposure "kiln", film.ambient.thin', "check"),
        ("thin = 0.5", "max_gap = 0.5", 'exposure "kiln", film.ambient, kiln.csv, line 4', "fill"),
        ("thin = 0.5", 'unit = "K", starts_at = 1', 'exposure "kiln", film.ambient', "before"),
        ('outside = "hold"', 'outsid = "hold"', 'exposure "below", film.coefficient.outsid', '"outside"'),
        ('{ hold = "2 h" }', '{ hlod = "2 h" }', 'exposure "below", film.ambient.firing.steps, step 2, hlod', '"hold"'),
        ("end = 120", "end = 0", "clock, end", "run on"),
        ("end = 120", "end = 500", 'exposure "kiln", film.ambient', "after"),
        ("end = 120", "end = 120\nsteady = true", "clock, steady", "alone"),
        ("[clock]\nend = 120\nreport_every = 5\n", "", "clock", "steady = true"),
        ("everywhere = 20", "regions = { deck = 20 }", "start, regions", "own table"),
        ("everywhere = 20", "everywhere = 1e400", "start, everywhere", "number"),
        ("at = [250, -50]", "at = [250]", 'gauge "beam web", at', "two coordinates"),
        ('at = "beam web"', 'at = "beam wbe"', 'limit 1 "steel keeps its strength", at', '"beam web"'),
        ('must = "stay below"', 'must = "stay blow"', 'limit 1 "steel keeps its strength", must', '"stay below"'),
        ('temperature = "350 degC"', "rate = 3", 'limit 1 "steel keeps its strength", rate', "drop"),
        ("gauges = 1", "gauges = 2024-05-01", "wanted, gauges", "one of these"),
        ('"stock.my brick.d', '"stock.my brik.d', 'variant "heavier", stock.my brik.density', '"my brick"'),
        ("= 2100", '= "2100 W"', 'variant "heavier", stock "my brick", density.value', "W"),
        ('title = "Deck on a steel beam"', "title = 3", "title", "quotes"),
        ("[wanted]", "[[void]]", "void", "[[region]]"),
        ("[wanted]", "[units]", "units", "move it there"),
    ],
)  # fmt: skip
def test_refusals(deck, old, new, place, says):
    assert old in DECK
    found = problems(DECK.replace(old, new), deck.parent)
    assert place in found, found
    assert says in found[place].hint


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("[docket\n", "line 1, column 8"),
        ("[docket]\na = \n", "line 2"),
        ("a = 1\na = 2\n", "line 2"),
        ("a = " + "[" * 5000, "deep"),
        ("a = " + "9" * 5000, "digits"),
    ],
)
def test_what_is_no_toml_names_its_line(text, says):
    (problem,) = problems(text).values()
    assert says in problem.value or says in problem.allowed


@pytest.mark.parametrize(
    ("old", "new", "hint"),
    [
        ('name = "deck"', "name = deck", 'quotes: "deck"'),
        ('name = "deck"', "name = the deck # ours", 'quotes: "the deck"'),
        ('name = "deck"', 'name = "deck', "close the quotes"),
        ("end = 120", "end = 1,5", "decimal point, not a comma: 1.5"),
        ("end = 120", "end = 2 h", 'quotes: "2 h"'),
        ("void = true", "void = True", "small letters"),
        ('[stock."my brick"]', "[stock.my brick]", "name with blanks in quotes"),
        ("end = 120", "end 120", "key = value"),
        ("[500, 0], [0, 0] ]", "[500, 0] [0, 0] ]", "comma between the rows"),
        ("[500, 0], [0, 0] ]", "[500, 0 0], [0, 0] ]", "mend the line"),
    ],
)
def test_slip_in_toml_quotes_its_line_and_guesses(old, new, hint):
    assert DECK.count(old) == 1
    row = DECK[: DECK.index(old)].count("\n") + 1
    (problem,) = problems(DECK.replace(old, new)).values()
    assert problem.value.startswith(f"line {row}, column ")
    assert new in problem.value
    assert hint in problem.hint


@pytest.mark.parametrize("name", ["region", "exposure", "gauge", "limit", "variant"])
def test_single_brackets_of_a_list_of_tables_are_told_once(deck, name):
    first = DECK.replace(f"[[{name}]]", f"[{name}]", 1)
    last = f"[[{name}]]".join(DECK.split(f"[[{name}]]")[:-1]) + f"[{name}]" + DECK.split(f"[[{name}]]")[-1]
    for text in (first, last):
        (problem,) = problems(text, deck.parent).values()
        assert f"[{name}]" in problem.value
        assert f"[[{name}]] in double brackets" in problem.hint


def test_lost_path_of_a_variant_is_told_once(deck):
    text = DECK.replace('"exposure.kiln.film.coefficient" = "30', '"exposure.klin.film.coefficient" = "30')
    for broken in (text, text.replace("planar", "plannar")):
        with pytest.raises(DocketError) as caught:
            read_text(broken, logs=LogFolder(deck.parent))
        told = [problem for problem in caught.value.problems if "klin" in problem.place]
        assert [problem.value for problem in told] == ['"30 W/m2K"']


def test_doubled_region_is_one_problem_though_an_exposure_names_an_edge_of_the_second(deck):
    (problem,) = problems(
        DECK.replace('name = "duct"\nvoid', 'name = "deck"\nvoid').replace('"duct.*"', '"deck.wall"'), deck.parent
    ).values()
    assert (problem.place, problem.hint) == ('region "deck", name', "rename one of the 2")


def test_limit_at_a_point_asks_for_a_gauge_once(deck):
    text = DECK.replace('at = "beam web"', "at = [50, 5]")
    found = problems(text, deck.parent)
    assert list(found) == ['limit 1 "steel keeps its strength", at']
    (problem,) = found.values()
    assert '"anywhere"' in problem.allowed
    assert "[[gauge]]" in problem.hint


def test_choices_stand_in_double_quotes(deck):
    text = DECK.replace('"stay below"', '"stay blow"').replace('"planar"', '"plannar"')
    found = problems(text, deck.parent)
    assert len(found) == 2
    for problem in found.values():
        assert "'" not in problem.allowed
        assert '"' in problem.allowed


@pytest.mark.parametrize(
    ("stock", "meant"),
    [("nosuch", ()), ("mineral wool", ("mineral wool",)), ("wool", ("wool",)), ("my brik", ('"my brick"',))],
)
def test_unknown_stock_suggests_what_has_its_words_and_nothing_else(deck, stock, meant):
    found = problems(DECK.replace('stock = "fireclay brick"', f'stock = "{stock}"'), deck.parent)
    (problem,) = found.values()
    assert 'own stock ("my brick")' in problem.allowed
    suggested = problem.hint.partition("?")[0].partition("did you mean ")[2]
    assert bool(suggested) == bool(meant)
    assert all(word in name for word in meant for name in suggested.split(" or "))


def test_docket_without_stock_of_its_own_says_so(deck):
    text = DECK.replace('"my brick"', '"fireclay brick"').replace('stock = "fireclay brick"', 'stock = "nosuch"')
    text = text[: text.index("# our own")] + text[text.index('[[exposure]]\nname = "kiln"') :]
    text = text.replace('"stock.my brick.density" = 2100\n', "")
    for problem in problems(text, deck.parent).values():
        assert "none of its own" in problem.allowed
        assert "(none)" not in problem.allowed


def test_reporting_interval_longer_than_the_clock_is_refused(deck):
    (problem,) = problems(DECK.replace("report_every = 5", "report_every = 121"), deck.parent).values()
    assert (problem.place, problem.value) == ("clock, report_every", "121 min")
    assert "120 min" in problem.allowed
    assert read_text(DECK.replace("report_every = 5", "report_every = 120"), logs=LogFolder(deck.parent))


def test_log_faults_stand_in_the_docket_with_their_lines(deck):
    (deck.parent / "kiln.csv").write_text("minute;kiln\n0;20\n1;\n1;x\n0,5;22\n130;300\n")
    found = problems(DECK, deck.parent)
    for place in ("kiln.csv, line 3", 'kiln.csv, line 4, column "kiln"'):
        assert f'exposure "kiln", film.ambient, {place}' in found
        assert sum(place in other for other in found) == 1  # the radiant surroundings read the same log


def test_log_that_is_missing_is_told_once(deck):
    (deck.parent / "kiln.csv").unlink()
    found = problems(DECK, deck.parent)
    (place,) = found
    assert "kiln" in place
    assert found[place].allowed == "a readable file: there is none"


TOP_KEYS = {
    *("docket", "section", "region", "stock", "exposure", "clock", "start", "gauge", "limit"),
    *("wanted", "allowance", "variant", "sources"),
}


@pytest.mark.parametrize(
    ("old", "new", "meant"),
    [
        ("[section]", "[secton]", "section"),
        ("[[region]]", "[[regoin]]", "region"),
        ('[stock."my brick"]', '[stok."my brick"]', "stock"),
        ("[[gauge]]", "[[gaug]]", "gauge"),
        ("[clock]", "[clok]", "clock"),
        ("[[gauge]]", "[[gauges]]", "gauge"),
    ],
)
def test_misspelt_table_is_one_fault_and_lists_what_a_file_may_hold(deck, old, new, meant):
    found = problems(DECK.replace(old, new), deck.parent)
    (problem,) = found.values()
    listed = problem.allowed.removeprefix("the keys ").split(", ")
    assert set(listed) == TOP_KEYS
    assert listed[0] == meant
    assert problem.hint == f'did you mean "{meant}"?'


def test_list_of_voids_says_how_to_draw_one_and_causes_no_other_fault(deck):
    text = DECK.replace('[[region]]\nname = "duct"\nvoid = true', '[[void]]\nname = "duct"')
    assert text != DECK
    (problem,) = problems(text, deck.parent).values()
    assert "[[region]] with void = true" in problem.hint


def test_misspelt_table_hides_no_other_fault(deck):
    found = problems(DECK.replace("[section]", "[secton]").replace('"planar"', '"plannar"'), deck.parent)
    assert {"secton", "section, kind"} <= found.keys()


def test_names_are_quoted_and_empty_lists_read(deck):
    text = DECK.replace('name = "beam web"', 'name = "bore, middle"')
    allowed = problems(text, deck.parent)['limit 1 "steel keeps its strength", at'].allowed
    assert '"bore, middle"' in allowed
    bare = DECK[: DECK.index("[[gauge]]")] + DECK[DECK.index("[[limit]]") :]
    text = bare.replace('must = "stay below"', 'must = "differ less than"')
    for problem in problems(text, deck.parent).values():
        assert "no the" not in problem.allowed


def test_log_below_absolute_zero(deck):
    (deck.parent / "kiln.csv").write_text("minute;kiln\n0;20\n130;-300\n")
    found = problems(DECK, deck.parent)
    assert 'exposure "kiln", film.ambient, kiln.csv, column "kiln"' in found


def test_several_faults_are_all_listed(deck):
    text = DECK.replace("planar", "plannar").replace('"deck.top"', '"deck.tpo"').replace("end = 120", 'end = "1 kg"')
    found = problems(text.replace('time = "min"', 'time = "minutes"').replace("my brick.d", "my brik.d"), deck.parent)
    assert {"docket, time", "section, kind", 'exposure "kiln", on, item 1', "clock, end"} <= found.keys()
    assert 'variant "heavier", stock.my brik.density' in found


def test_file_that_is_missing_names_the_nearest(deck):
    with pytest.raises(DocketError) as caught:
        read_docket(deck.with_name("dek.docket.toml"))
    assert '"deck.docket.toml"' in str(caught.value)
    for name in ("deck.toml", "kiln.csv"):
        with pytest.raises(DocketError):
            read_docket(deck.with_name(name))
    with pytest.raises(DocketError):
        read_docket(deck.parent / "none" / "deck.docket.toml")
    folder = deck.with_name("folder.docket.toml")
    folder.mkdir()
    with pytest.raises(DocketError):
        read_docket(folder)


def test_file_that_is_no_text(deck, monkeypatch):
    deck.write_bytes(b"\xff\xfe")
    with pytest.raises(DocketError) as caught:
        read_docket(deck)
    assert "UTF-8" in str(caught.value)
    monkeypatch.setattr("fem.docket.file.MAX_TEXT", 1)
    with pytest.raises(DocketError) as caught:
        read_docket(deck)
    assert "at most 1 bytes" in str(caught.value)


# --- zip --------------------------------------------------------------------------------------------------------------


def test_pack_and_read(deck):
    target = pack(deck)
    assert target.name == "deck.zip"
    docket = read_docket(deck)
    assert read_docket(target) == docket
    assert content_hash(read_docket(target)) == content_hash(docket)
    assert read_docket(target).variant("heavier") == docket.variant("heavier")
    first = target.read_bytes()
    assert pack(deck, deck.with_name("other.zip")).read_bytes() == first
    with zipfile.ZipFile(target) as archive:
        assert archive.namelist() == ["deck.docket.toml", "kiln.csv"]


def zipped(path: Path, members, flags=None):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in members:
            entry = zipfile.ZipInfo(name)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = (flags or 0) << 16
            archive.writestr(entry, content)
    path.write_bytes(stream.getvalue())
    return path


GOOD = [("deck.docket.toml", DECK), ("kiln.csv", LOG)]


@pytest.mark.parametrize(
    ("members", "says"),
    [
        ([*GOOD, ("../x.csv", "")], "inside"),
        ([*GOOD, ("/etc/x.csv", "")], "inside"),
        ([*GOOD, ("C:x.csv", "")], "inside"),
        ([*GOOD, ("a\\..\\x.csv", "")], "inside"),
        ([*GOOD, ("a/../../x.csv", "")], "inside"),
        ([GOOD[1]], "one NAME"),
        ([*GOOD, ("b.docket.toml", DECK)], "one NAME"),
        ([("folder/deck.docket.toml", DECK), GOOD[1]], "one NAME"),
        ([GOOD[0]], "a file of the zip"),
        ([("deck.docket.toml", b"\xff\xfe"), GOOD[1]], "UTF-8"),
    ],
)
def test_zip_refusals(tmp_path, members, says):
    with pytest.raises(DocketError) as caught:
        read_docket(zipped(tmp_path / "a.zip", members))
    assert says in str(caught.value)


@pytest.mark.filterwarnings("ignore:Duplicate name")
def test_zip_refuses_doubled_files(tmp_path):
    with pytest.raises(DocketError) as caught:
        read_docket(zipped(tmp_path / "a.zip", [*GOOD, GOOD[1]]))
    assert "once" in str(caught.value)


def test_zip_refuses_links(tmp_path):
    with pytest.raises(DocketError) as caught:
        read_docket(zipped(tmp_path / "a.zip", GOOD, stat.S_IFLNK | 0o777))
    assert "no links" in str(caught.value)


def test_zip_refuses_encrypted_files(tmp_path):
    path = zipped(tmp_path / "a.zip", GOOD)
    content = bytearray(path.read_bytes())
    for mark, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        at = content.find(mark)
        while at >= 0:
            content[at + offset] |= 1
            at = content.find(mark, at + 4)
    path.write_bytes(content)
    with pytest.raises(DocketError) as caught:
        read_docket(path)
    assert "encrypted" in str(caught.value)


@pytest.mark.parametrize(
    ("bound", "value", "says"),
    [("MAX_MEMBERS", 1, "files"), ("MAX_TOTAL", 2000, "bytes"), ("MAX_TEXT", 10, "at most 10")],
)
def test_zip_bounds(tmp_path, monkeypatch, bound, value, says):
    path = zipped(tmp_path / "a.zip", GOOD)
    monkeypatch.setattr(docket_zip, bound, value)
    with pytest.raises(DocketError) as caught:
        read_docket(path)
    assert says in str(caught.value)


def test_zip_that_unpacks_without_end_is_stopped(tmp_path, monkeypatch):
    monkeypatch.setattr(docket_zip, "MAX_BYTES", 100_000)
    path = zipped(tmp_path / "a.zip", [("deck.docket.toml", DECK), ("kiln.csv", b"0" * 10_000_000)])
    assert path.stat().st_size < 100_000
    asked = []
    read = zipfile.ZipExtFile.read
    monkeypatch.setattr(zipfile.ZipExtFile, "read", lambda self, n=-1: asked.append(n) or read(self, n))
    with pytest.raises(DocketError) as caught:
        read_docket(path)
    assert "larger than 100000 bytes" in str(caught.value)
    assert asked == [100_001, 100_001]  # never the whole of it into memory


def test_zip_that_is_none(tmp_path):
    path = tmp_path / "a.zip"
    for content in (b"", b"PK\x03\x04 cut", b"text"):
        path.write_bytes(content)
        with pytest.raises(DocketError):
            read_docket(path)
    with pytest.raises(DocketError):
        read_docket(tmp_path / "none.zip")


def test_pack_refuses_what_could_not_be_opened(deck, monkeypatch):
    monkeypatch.setattr(docket_zip, "MAX_MEMBERS", 1)
    with pytest.raises(DocketError):
        pack(deck)
    assert not deck.with_name("deck.zip").exists()


# --- round trips ------------------------------------------------------------------------------------------------------

lengths = st.floats(-50, 50).filter(lambda x: x == 0 or abs(x) > 1e-9)
temperatures = st.floats(1.0, 3000.0)
letters = st.characters(min_codepoint=33, max_codepoint=0x24F, exclude_characters="\"'.*\x7f")
names = st.text(letters, min_size=1, max_size=12).filter(
    lambda s: s.isprintable() and s == s.strip() and s != "anywhere"
)
units = st.builds(FileUnits, st.sampled_from(LENGTHS), st.sampled_from(TIMES), st.sampled_from(TEMPERATURES))
OUTSIDE = {"before": "hold", "after": "hold"}


@st.composite
def schedules(draw):
    kind = draw(st.sampled_from(("number", "points", "firing")))
    if kind == "number":
        return draw(temperatures)
    steps, values = draw(st.lists(st.floats(0.1, 50), min_size=2, max_size=5)), st.tuples(temperatures, temperatures)
    if kind == "points":
        return Points(points=[(sum(steps[: i + 1]), draw(temperatures)) for i in range(len(steps))], **OUTSIDE)
    start, to = draw(values)
    return Firing(
        firing={"start": start, "steps": [{"to": to, "over": dt} for dt in steps] + [{"hold": 5.0}]}, **OUTSIDE
    )


@st.composite
def dockets(draw):
    region, gauge, stock = draw(st.lists(names, min_size=3, max_size=3, unique=True))
    points = st.lists(st.tuples(lengths, lengths), min_size=3, max_size=6, unique=True)
    outline = [Vertex(x=x, y=y, edge=draw(st.none() | names)) for x, y in draw(points)]
    brick = {"conductivity": draw(st.floats(0.01, 400)), "density": draw(st.floats(1, 2e4))}
    film = Film(coefficient=draw(st.floats(0, 1e4)), ambient=draw(schedules()))
    temperature, at_least = draw(temperatures), draw(st.floats(1e-3, 1e3))
    return Docket(
        title=draw(st.text(max_size=30)),
        units=draw(units),
        section=Section(kind="planar", regions=(Region(name=region, stock=stock, outline=outline),)),
        stock={stock: Stock(specific_heat=[[300, 900], [draw(st.floats(301, 900)), 950.0]], **brick)},
        exposures=(Exposure(name=draw(names), on=f"{region}.*", film=film),),
        clock=Clock(begin=draw(st.floats(-1e4, 0)), end=1e5, report_every=draw(st.floats(10, 1e4))),
        start=Start(everywhere=draw(temperatures)),
        gauges=(Gauge(name=gauge, x=draw(lengths), y=draw(lengths), band=draw(st.none() | st.floats(1e-3, 10))),),
        limits=(Limit(name="l", at=gauge, must="hold above", temperature=temperature, at_least=at_least),),
        wanted=Wanted(gauges=draw(st.floats(1e-3, 10))),
        variants=(Variant(name="v", changes={"start.everywhere": "300 K"}),),
        sources=draw(st.dictionaries(names, st.text(max_size=20), max_size=2)),
    )


@settings(max_examples=60, deadline=None)
@given(dockets())
def test_any_docket_reads_back_the_same(docket):
    text = to_text(docket)
    back = read_text(text, logs=LogFolder())
    assert back == docket
    assert content_hash(back) == content_hash(docket)
    assert update_text(text, docket) == text


@settings(max_examples=30, deadline=None)
@given(dockets(), units)
def test_hash_does_not_depend_on_the_units_of_the_file(docket, other):
    there = docket.model_copy(update={"units": other})
    assert content_hash(read_text(to_text(there), logs=LogFolder())) == content_hash(docket)
