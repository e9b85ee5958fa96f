"""The README keeps its word: its docket poses, and it names every key that a file may have."""

import re
from pathlib import Path
from typing import get_args

import pytest

from fem.docket import Allowance, Clock, Docket, Exposure, Film, Gauge, Limit, Radiant, Region, Section, Start, Stretch
from fem.docket.file import HEADER, read_text
from fem.docket.limits import NEEDED, OPTIONAL, Must
from fem.docket.models import FILE_KEYS
from fem.docket.terms import Variant, Wanted
from fem.earn.pose import pose
from fem.quantities.kinds import KINDS
from fem.quantities.units import FileUnits
from fem.schedules.log_folder import LogFolder
from fem.schedules.models import SCHEDULES, FiringPlan, FiringStep, Wave
from fem.stock.models import Stock
from fem.stock.properties import Property, SourceKind

README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
REFERENCE = README[README.index("## Every key of a docket") : README.index("## What a band is")]
LONGEST_LINE = 140
PYTHON_ONLY = {"law"}
MODELS = (
    *(Section, Region, Stretch, Exposure, Film, Radiant, Clock, Start, Gauge, Limit, Wanted, Allowance, Variant),
    *(Stock, Property, FiringPlan, FiringStep, Wave, *SCHEDULES.values()),
)
SI_NUMBERS = {
    "film coefficient": "W/(m² K)",
    "conductivity": "W/(m K)",
    "density": "kg/m³",
    "specific heat": "J/(kg K)",
    "heat flux": "W/m²",
    "heat source": "W/m³",
}


def example():
    (text,) = re.findall(r"```toml\n(.*?)```", README, re.DOTALL)
    return read_text(text, logs=LogFolder(), file="plate.docket.toml")


def words_of(text):
    """Every word inside code marks: a key named in prose only is no key named."""
    return set(re.findall(r"\w+", " ".join(re.findall(r"`([^`]+)`", text))))


def test_example_poses():
    posed = pose(example())
    assert posed.plan.region_names == ("plate", "slab")
    assert {face.name for face in posed.problem.faces} == {"burner", "room"}


def test_variant_of_the_example_poses():
    docket = example()
    (variant,) = docket.variants
    assert docket.variant(variant.name) != docket
    pose(docket.variant(variant.name))


@pytest.mark.parametrize("model", MODELS, ids=lambda model: model.__name__)
def test_every_key_of_a_file_is_named_in_the_reference(model):
    known = words_of(REFERENCE)
    keys = set(model.file_keys()) - PYTHON_ONLY
    if model is Section:
        keys -= {"region"}  # a table of its own
    assert keys <= known, keys - known


def test_every_table_and_every_choice_is_named():
    known = words_of(REFERENCE)
    assert set(FILE_KEYS) <= known
    assert {"format", "title", *HEADER} <= known
    for text in (*get_args(Must), *get_args(SourceKind)):
        assert f'"{text}"' in REFERENCE


def test_reference_names_no_key_of_a_limit_beside_a_must_that_refuses_it():
    rows = [line.split("|")[1:3] for line in REFERENCE.splitlines() if line.startswith('| `"')]
    told = {must: words_of(keys) - {"from", "to"} for musts, keys in rows for must in re.findall(r'"([^"]+)"', musts)}
    taken = {must: {*NEEDED[must], *OPTIONAL.get(must, ("during",))} for must in get_args(Must)}
    assert told == taken


def test_defaults_that_are_told_are_those_of_the_models():
    assert f"`cells`* ({Allowance().cells})" in REFERENCE
    assert f"`seconds`* ({Allowance().seconds:g})" in REFERENCE
    assert f"`gauges`* ({Wanted().gauges:g} K)" in REFERENCE
    tolerance = Section.model_fields["gap_tolerance"].default
    assert f"`gap_tolerance`* ({tolerance * 1e3:g} mm;" in REFERENCE


@pytest.mark.parametrize(("kind", "unit"), SI_NUMBERS.items())
def test_bare_numbers_that_are_called_si_are_si_in_every_file(kind, unit):
    assert FileUnits("mm", "min", "degF").of(kind) == KINDS[kind].si
    assert KINDS[kind].si.replace("^2", "²").replace("^3", "³") == unit
    assert unit in REFERENCE


def test_bare_numbers_that_are_said_to_follow_the_header_do():
    told = {"lengths", "times", "temperatures", "temperature differences", "rates"}
    first = " ".join(REFERENCE[: REFERENCE.index("Always SI")].split())
    assert all(word in first for word in told)
    following = {kind for kind in KINDS if FileUnits("mm", "min", "degF").of(kind) != KINDS[kind].si}
    assert following == {word.removesuffix("s") for word in told - {"rates"}} | {"heating rate"}


def test_no_line_is_too_long_to_read():
    assert max(map(len, README.splitlines())) <= LONGEST_LINE


def test_docket_made_in_python_holds_the_same_tables():
    names = {field.alias or name for name, field in Docket.model_fields.items() if name not in ("title", "units")}
    assert names == set(FILE_KEYS) - {"docket", "region"}
