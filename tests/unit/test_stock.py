import re
import subprocess
import sys
import tomllib
from importlib.resources import files
from itertools import pairwise
from typing import get_args

import numpy as np
import pytest
from pydantic import ValidationError

from fem.errors import DocketError
from fem.laws import Law
from fem.quantities.strict import Strict
from fem.quantities.units import FileUnits
from fem.stock.models import PROPERTIES, Stock, find, library, nearest, stock_table
from fem.stock.plot import plot_stock
from fem.stock.properties import SourceKind

CELSIUS = FileUnits(temperature="degC")
ALL = list(library().values())
NOT_AT_20_DEGC = {"ice", "snow, fresh", "snow, slightly compacted", "snow, compacted", "frozen clay or silt"}


RAW = {"conductivity": 1.1, "density": 2000, "specific_heat": 880}


def stock(**changes):
    return Stock(**{**RAW, **changes})


def messages(error):
    return {".".join(str(part) for part in line["loc"]): line["msg"] for line in error.value.errors()}


# what a property may be written as


def test_constant_gives_constant_laws():
    made = stock()
    assert made.k_law().constant
    assert made.heat_capacity_law().constant
    assert made.heat_capacity_law()() == 2000 * 880


@pytest.mark.parametrize(
    "table",
    [
        [[300, 1.0], [500, 2.0]],
        ((300, 1.0), (500, 2.0)),
        np.array([[300.0, 1.0], [500.0, 2.0]]),
        "300\t1.0\n500\t2.0\n",
        "300; 1.0\n\n500; 2.0",
        "300 K; 1.0 W/(m K)\n500 K; 2.0 W/(m K)",
        {"table": "300 1.0\n500 2.0"},
        lambda T: np.interp(T, [300, 500], [1, 2]),
        Law(lambda T: np.interp(T, [300, 500], [1, 2]), frozenset({"T"})),
    ],
)
def test_every_way_to_write_a_table_gives_the_same_law(table):
    law = stock(conductivity=table).k_law()
    assert law.needs == {"T"}
    np.testing.assert_allclose(
        law(T=np.array([200.0, 300.0, 350.0, 500.0, 900.0])), [1.0, 1.0, 1.25, 2.0, 2.0], rtol=1e-15
    )


def test_a_file_in_degc_is_read_in_degc():
    made = Stock.model_validate(
        {
            "conductivity": [[20, 1.1], [800, "1.4 W/mK"]],
            "density": "2 g/cm^3",
            "specific_heat": 880,
            "range": [0, 1400],
        },
        context=CELSIUS,
    )
    assert made.conductivity.table == ((293.15, 1.1), (1073.15, 1.4))
    assert made.density.value == 2000
    assert made.range == (273.15, 1673.15)


def test_heat_capacity_is_the_product_where_both_vary():
    made = stock(density=[[300, 2000], [400, 1800]], specific_heat=lambda T: 800 + T)
    T = np.linspace(280.0, 420.0, 29)
    np.testing.assert_allclose(
        made.heat_capacity_law()(T=T), np.interp(T, [300, 400], [2000, 1800]) * (800 + T), rtol=1e-14
    )


def test_heat_capacity_may_vary_with_place():
    made = stock(specific_heat=lambda x, T: 800 + T + 0 * x)
    assert made.heat_capacity_law().needs == {"x", "T"}
    assert made.heat_capacity_law()(x=0.1, T=300.0) == 2000 * 1100


# ranges and sources


def test_range_of_a_property_is_its_own_then_the_stocks_then_the_tables():
    table = [[300, 1.0], [500, 2.0]]
    assert stock(conductivity={"table": table, "range": (250, 600)}, range=(200, 900)).range_of("conductivity") == (
        250,
        600,
    )
    assert stock(conductivity=table, range=(200, 900)).range_of("conductivity") == (200, 900)
    assert stock(conductivity=table).range_of("conductivity") == (300, 500)
    assert stock().range_of("conductivity") is None


def test_valid_range_is_where_all_properties_hold():
    made = stock(conductivity=[[300, 1.0], [500, 2.0]], specific_heat=[[250, 800], [450, 900]])
    assert made.valid_range == (300, 450)
    assert made.without_range() == ("density",)
    assert stock().valid_range == (0.0, float("inf"))


def test_source_of_a_property_is_its_own_then_the_stocks():
    made = stock(density={"value": 2000, "source": "weighed", "kind": "from memory"}, source="supplier's sheet")
    assert made.source_of("density") == ("weighed", "from memory")
    assert made.source_of("conductivity") == ("supplier's sheet", "stated in the docket")
    assert stock().source_of("density")[0] == "no source stated"


# refusals, each with its place


@pytest.mark.parametrize(
    ("changes", "place", "says"),
    [
        ({"conductivity": 0}, "conductivity.value", "conductivity above 0"),
        ({"conductivity": "7,5"}, "conductivity.value", "decimal point"),
        ({"conductivity": "20 7,5\n30 8"}, "conductivity", "decimal point"),
        ({"conductivity": "20 1 2\n30 8 3"}, "conductivity", "two cells"),
        ({"conductivity": [[300, 1.0]]}, "conductivity", "two rows"),
        ({"conductivity": [[300, 1.0], [300, 2.0]]}, "conductivity", "row 2 is not above row 1"),
        ({"conductivity": [[300, 1.0], [400, -2.0]]}, "conductivity.table.1.1", "conductivity above 0"),
        ({"conductivity": {"value": 1.0, "table": [[300, 1.0], [400, 2.0]]}}, "conductivity", "exactly one"),
        ({"conductivity": {}}, "conductivity", "exactly one"),
        ({"conductivity": {"value": 1.0, "tabel": 2}}, "conductivity.tabel", '"table"'),
        ({"conductivity": {"value": 1.0, "range": (400, 300)}}, "conductivity", "lower to a higher"),
        ({"conductivity": lambda q: 1.0}, "conductivity", "parameters"),
        ({"conductivity": lambda t: 1.0}, "conductivity", "parameters"),
        ({"conductivity": lambda T: T - 300}, "conductivity", "283.15 K"),
        ({"conductivity": lambda T: T * np.nan}, "conductivity", "finite"),
        ({"conductivity": lambda T: np.ones(3)}, "conductivity", "for each temperature"),
        ({"conductivity": lambda T: 1.0 if T > 300 else 2.0}, "conductivity", "numpy arrays"),
        ({"range": (400, 300)}, "", "lower to a higher"),
        ({"conductivity": [[300, 1], [400, 2]], "density": [[500, 1], [600, 2]]}, "", "overlap"),
        ({"kind": "hearsay"}, "kind", "published"),
        ({"densty": 2}, "densty", '"density"'),
    ],
)
def test_bad_stock_is_refused_with_its_place(changes, place, says):
    with pytest.raises(ValidationError) as error:
        stock(**changes)
    found = messages(error)
    assert place in found
    assert says in found[place]


def test_a_law_is_tried_in_the_range_that_it_states():
    stock(conductivity={"law": lambda T: T - 300, "range": (400, 500)})


def test_a_stock_is_frozen_and_survives_its_own_dump():
    for made in (library()["carbon steel"], stock(range=(250, 400), source="weighed")):
        assert Stock.model_validate(made.model_dump()) == made
        with pytest.raises(ValidationError):
            made.name = "other"


class Shelf(Strict):
    stock: dict[str, Stock]


def test_a_made_stock_is_not_read_again_in_the_units_of_a_file():
    brick, stone = library()["fireclay brick"], library()["sandstone"]
    assert stone.range is not None
    assert Shelf.model_validate({"stock": {"a": brick, "b": stone}}, context=CELSIUS).stock == {"a": brick, "b": stone}
    made = Stock.model_validate({**RAW, "conductivity": brick.conductivity}, context=CELSIUS)
    assert made.conductivity == brick.conductivity


# the library


def test_library_has_enough_of_every_family():
    families = {made.family for made in ALL}
    assert len(ALL) >= 70
    assert families == {
        "metals", "refractories", "insulation", "building", "ground", "polymers", "glass and ceramics", "foods",
        "fluids at rest", "ice and snow",
    }  # fmt: skip


def test_library_names_and_aliases_point_to_one_stock():
    owner = {}
    for made in ALL:
        for label in (made.name, *made.aliases):
            assert owner.setdefault(label.casefold(), made.name) == made.name, label


def test_library_read_whole_no_name_lost_between_files():
    counted = 0
    for file in (files("fem.stock") / "data").iterdir():
        if file.name.endswith(".toml"):
            counted += len(tomllib.loads(file.read_text(encoding="utf-8"))["stock"])
    assert counted == len(ALL)


@pytest.mark.parametrize("made", ALL, ids=lambda made: made.name)
def test_library_stock_states_source_and_range_of_every_property(made):
    assert made.without_range() == ()
    for name in PROPERTIES:
        text, kind = made.source_of(name)
        assert text != "no source stated"
        assert kind in get_args(SourceKind)
        assert kind != "stated in the docket"
        if kind.startswith("published"):
            assert re.search(r"\d{3,4}|data sheet|ASM Handbook", text), (
                "a published source is named with its number or year"
            )


@pytest.mark.parametrize("made", ALL, ids=lambda made: made.name)
def test_library_stock_says_where_its_range_passes_its_rows(made):
    for name, own in made.properties().items():
        if own.table is None:
            continue
        (low, high), (T, _) = made.range_of(name), own.rows()
        text, _ = made.source_of(name)
        assert ("first value stands" in text) == (low < T[0])
        assert ("last value stands" in text) == (high > T[-1])


@pytest.mark.parametrize("made", ALL, ids=lambda made: made.name)
def test_library_stock_holds_at_20_degc_or_says_why_not(made):
    low, high = made.valid_range
    if made.name in NOT_AT_20_DEGC:
        assert high <= 273.15
        assert re.search("melt|freez", made.note)
    else:
        assert low <= 293.15 < high


def test_a_fluid_says_that_it_is_at_rest():
    fluids = [made for made in ALL if made.family == "fluids at rest"]
    assert fluids
    assert all("at rest" in made.name and "moves carries more heat" in made.note for made in fluids)


def test_laws_follow_every_row_of_the_library():
    for made in ALL:
        for own in made.properties().values():
            T, values = own.rows()
            if T.size:
                np.testing.assert_array_equal(own.to_law()(T=T), values)
                middle = 0.5 * (T[1:] + T[:-1])
                halves = np.array([0.5 * (a + b) for a, b in pairwise(values)])
                np.testing.assert_allclose(own.to_law()(T=middle), halves, rtol=1e-12)


def test_find_looks_at_names_aliases_and_families():
    assert find("IFB 26")[0].name == "insulating brick L1400"
    assert {made.family for made in find("refractories")} == {"refractories"}
    assert "steel" in find("steel")[0].name
    assert "fireclay brick" in [made.name for made in find("clay brick")]
    assert find("no such stuff") == []
    assert len(find("")) == len(ALL)


@pytest.mark.parametrize(
    ("typed", "meant"),
    [
        ("carbon stel", "carbon steel"),
        ("mild steel", "carbon steel"),
        ("IFB 23", "insulating brick L1260"),
        ("Glas wool", "glass wool 12 kg/m3"),
    ],
)
def test_nearest_names_what_was_meant(typed, meant):
    assert meant in nearest(typed)


def test_nearest_of_nonsense_is_nothing():
    assert nearest("qqqqqq") == []
    assert nearest("") == []


def test_stock_table_spans_the_range_and_agrees_with_the_laws():
    made = library()["fireclay brick"]
    shown = stock_table(made, 5)
    np.testing.assert_allclose(shown.T, np.linspace(*made.valid_range, 5))
    np.testing.assert_allclose(
        shown.diffusivity, made.k_law()(T=shown.T) / made.heat_capacity_law()(T=shown.T), rtol=1e-14
    )
    assert stock_table(stock(), 2, within=(300, 400)).density.tolist() == [2000, 2000]


def test_stock_table_without_a_range_is_refused():
    with pytest.raises(DocketError, match="range"):
        stock_table(stock(name="my brick"))


# the picture


def test_plot_writes_one_whole_png(tmp_path):
    path = plot_stock(library()["carbon steel"], tmp_path / "steel.png")
    assert path.read_bytes().startswith(b"\x89PNG\r\n\x1a\n")
    assert path.read_bytes().rstrip().endswith(b"IEND\xaeB`\x82")
    assert [entry.name for entry in tmp_path.iterdir()] == ["steel.png"]


def test_plot_that_fails_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "steel.png"
    path.write_bytes(b"old")

    def full_disk(*args, **kwargs):
        raise OSError("no space left")

    monkeypatch.setattr("matplotlib.figure.Figure.savefig", full_disk)
    with pytest.raises(OSError, match="no space"):
        plot_stock(library()["carbon steel"], path)
    assert path.read_bytes() == b"old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["steel.png"]


def test_plot_refuses_a_stock_without_a_range(tmp_path):
    with pytest.raises(DocketError, match="range"):
        plot_stock(stock(), tmp_path / "x.png")


def test_plot_takes_a_callable_and_keeps_pyplot_out(tmp_path):
    plot_stock(stock(name="made up", conductivity=lambda T: T / 300, range=(280, 400)), tmp_path / "x.png")
    code = "import sys, fem.stock.plot; sys.exit('matplotlib.pyplot' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
