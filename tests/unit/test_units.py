"""Units: exact factors, no offset where there is none, and every refusal.

Factors are those of NIST SP 811 (2008), appendix B: 1 in = 0.0254 m exactly; t/°F = 1.8 t/°C + 32; T/K = t/°C + 273.15.
"""

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import BaseModel, ValidationError
from pydantic_core import PydanticCustomError

from fem.errors import DocketError
from fem.quantities.kinds import KINDS
from fem.quantities.unit_text import is_unit_text, tidy_unit
from fem.quantities.units import (
    LENGTHS,
    SI,
    TEMPERATURES,
    TIMES,
    FileUnits,
    Fraction01,
    Length,
    Quantity,
    Reading,
    Temperature,
    celsius,
    in_unit,
    said,
    scale_of,
    to_si,
    written,
)

GOOD = [
    ("12 mm", "length", 0.012),
    ("2 in", "length", 0.0508),
    ("1 µm", "length", 1e-6),
    ("45 min", "time", 2700.0),
    ("2 h", "time", 7200.0),
    ("1 day", "time", 86400.0),
    ("20 °C", "temperature", 293.15),
    ("20 C", "temperature", 293.15),
    ("20degC", "temperature", 293.15),
    ("-40 degF", "temperature", 233.15),
    ("-40 °F", "temperature", 233.15),
    ("212 degF", "temperature", 373.15),
    ("300 K", "temperature", 300.0),
    ("5 K", "temperature difference", 5.0),
    ("5 °C", "temperature difference", 5.0),
    ("9 degF", "temperature difference", 5.0),
    ("60 K/min", "heating rate", 1.0),
    ("3600 °C/h", "heating rate", 1.0),
    ("9 degF/s", "heating rate", 5.0),
    ("3 kW/m^2", "heat flux", 3000.0),
    ("25 W/m2K", "film coefficient", 25.0),
    ("25 W/(m²·K)", "film coefficient", 25.0),
    ("25 W/(m^2 °C)", "film coefficient", 25.0),
    ("5 kW/m3", "heat source", 5000.0),
    ("1.1 W/mK", "conductivity", 1.1),
    ("1.1 W/m°C", "conductivity", 1.1),
    ("1.1 W/(m K)", "conductivity", 1.1),
    ("2 g/cm3", "density", 2000.0),
    ("0.88 kJ/kgK", "specific heat", 880.0),
    ("85 %", "fraction", 0.85),
    ("0.85", "fraction", 0.85),
    ("2 min", "seconds", 120.0),
    ("1e3 mm", "length", 1.0),
    (".5 m", "length", 0.5),
]


@pytest.mark.parametrize(("text", "kind", "value"), GOOD)
def test_text_with_unit(text, kind, value):
    assert Quantity(kind).read(text) == value


BAD = [
    ("7,5 mm", "length", "decimal point"),
    ("1.234,5 mm", "length", "decimal point"),
    ("12 kg", "length", "kg"),
    ("45 m", "time", '"m"'),
    ("20 degX", "temperature", "degX"),
    ("mm", "length", "number"),
    ("", "length", "number"),
    ("12 mm x", "length", "mm x"),
    ("9**9**9 m", "length", "not a unit"),
    ("1 m^99999", "length", "not a unit"),
    ("1e999 m", "length", "smaller"),
    ("nan m", "length", "number"),
    ("3 W", "heat", "not a unit"),
    (math.inf, "length", "number"),
    (math.nan, "length", "number"),
    (10**400, "length", "number"),
    (True, "length", "one of these"),
    (None, "length", "one of these"),
    ([1], "length", "one of these"),
    (-0.1, "temperature", "unit"),
    (1.5, "fraction", "unit"),
    (0.0, "conductivity", "unit"),
    (2e5, "length", "unit"),
]


@pytest.mark.parametrize(("value", "kind", "says"), BAD)
def test_refusals_say_how_to_mend(value, kind, says):
    with pytest.raises(PydanticCustomError) as caught:
        Quantity(kind).read(value)
    assert says in caught.value.context["hint"]
    assert KINDS[kind].name in caught.value.context["allowed"]


def test_bounds_are_told_in_the_files_units():
    with pytest.raises(PydanticCustomError) as caught:
        Quantity("temperature").read(-300, FileUnits(temperature="degC"))
    assert "-273.15" in caught.value.context["allowed"]
    assert "degC" in caught.value.context["allowed"]


def test_bounds_of_a_field_replace_those_of_its_kind():
    mark = Quantity("length", 0.0, 1.0, open_low=True)
    assert mark.read(1.0) == 1.0
    for value in (0.0, 1.0000001):
        with pytest.raises(PydanticCustomError):
            mark.read(value)


def test_bare_numbers_speak_the_files_units():
    units = FileUnits("mm", "min", "degF")
    assert Quantity("length").read(12, units) == 0.012
    assert Quantity("time").read(2, units) == 120.0
    assert Quantity("temperature").read(212, units) == 373.15
    assert Quantity("temperature difference").read(9, units) == 5.0
    assert Quantity("heating rate").read(540, units) == 5.0
    assert Quantity("film coefficient").read(25, units) == 25.0
    assert Quantity("seconds").read(25, units) == 25.0
    assert Quantity("heat").read(25, units) == 25.0


def test_text_without_unit_is_a_bare_number():
    assert Quantity("length").read("12", FileUnits("mm")) == 0.012


def test_file_units_take_spellings_and_refuse_others():
    assert FileUnits("mm", "h", "°C").temperature == "degC"
    for wrong in ({"length": "km"}, {"time": "d"}, {"temperature": "C°"}, {"length": 3}):
        with pytest.raises(DocketError) as caught:
            FileUnits(**wrong)
        assert caught.value.problems[0].hint


def test_units_come_from_the_validation_context():
    class Part(BaseModel):
        x: Length
        T: Temperature
        e: Fraction01

    units = FileUnits("mm", "s", "degC")
    for context in (units, Reading(units)):
        part = Part.model_validate({"x": 1, "T": 0, "e": 1}, context=context)
        assert (part.x, part.T, part.e) == (0.001, 273.15, 1.0)
    assert Part(x=np.float64(1.0), T="0 °C", e=np.int64(1)).T == 273.15
    with pytest.raises(ValidationError):
        Part(x=1, T=1, e=2)


@pytest.mark.parametrize("kind", [k for k in KINDS if k != "heat"])
def test_every_si_unit_is_itself(kind):
    assert scale_of(KINDS[kind].si, kind) == (Fraction(1), Fraction(0))


def test_examples_in_messages_are_accepted():
    for kind, what in KINDS.items():
        if kind == "heat":
            continue
        for example in what.examples.split(", "):
            text = example.strip()
            Quantity(kind).read(text.strip('"') if text.startswith('"') else float(text))


def test_conversion_is_rounded_once():
    # 0.1 in is 0.00254 m exactly; 0.1 * 0.0254 in floats is not the nearest one.
    assert to_si(0.1, "in", "length") == 0.00254
    assert Quantity("length").read("0.1 in") == Quantity("length").read("2.54 mm") == 0.00254


@given(st.decimals(-1000, 1000, places=4))
def test_text_is_converted_exactly_and_rounded_once(number):
    assert Quantity("length").read(f"{number} in") == float(Fraction(number) * Fraction(254, 10_000))
    kelvin = Fraction(number) + Fraction(27_315, 100)
    if kelvin >= 0:
        assert Quantity("temperature").read(f"{number} degC") == float(kelvin)


ALL_UNITS = st.builds(FileUnits, st.sampled_from(LENGTHS), st.sampled_from(TIMES), st.sampled_from(TEMPERATURES))
SCHEDULED = ("length", "time", "temperature", "temperature difference", "heating rate", "heat flux", "heat")


@given(st.sampled_from(SCHEDULED), ALL_UNITS, st.floats(1e-6, 9e4))
def test_written_numbers_read_back_the_same(kind, units, value):
    again = written(value, kind, units)
    assert Quantity(kind).read(again, units) == value


@given(ALL_UNITS, st.decimals(-200, 900, places=2))
def test_typed_numbers_are_written_as_typed(units, number):
    typed = float(number)
    for kind in ("length", "time"):
        assert written(Quantity(kind).read(typed, units), kind, units) == typed
    if units.temperature == "degC":
        assert written(Quantity("temperature").read(typed, units), "temperature", units) == typed


def test_written_falls_back_to_text_where_the_offset_swallows_the_digits():
    units = FileUnits(temperature="degC")
    assert written(1e-20, "temperature", units) == "1e-20 K"
    assert written(273.15, "temperature", units) == 0
    assert isinstance(written(293.15, "temperature", units), int)


@given(st.floats(0.0, 5e3), st.sampled_from(TEMPERATURES))
def test_in_unit_undoes_to_si(value, unit):
    assert to_si(in_unit(value, unit, "temperature"), unit, "temperature") == pytest.approx(value, abs=2e-12)


def test_said_speaks_the_files_units():
    assert said(43200.0, "time", FileUnits("mm", "min", "degC")) == "720 min"
    assert said(5.0, "temperature difference", FileUnits(temperature="degF")) == "9 degF"
    assert said(0.5, "fraction", SI) == "0.5"


def test_celsius_of_arrays():
    np.testing.assert_allclose(celsius(np.array([273.15, 373.15])), [0.0, 100.0], atol=1e-12)


def test_unit_text_is_guarded():
    assert is_unit_text("W/(m^2 K)")
    for text in ("m^12", "m**2**3x!", "__import__('os')", "m" * 50, "a=b", "m^"):
        assert not is_unit_text(tidy_unit(text)), text


def test_unknown_unit_is_a_value_error():
    for unit, kind in (("kg", "length"), ("K", "heat"), ("blah", "time")):
        with pytest.raises(ValueError, match=r"unknown|plain number|not a unit"):
            scale_of(unit, kind)


def test_bounds_read_as_a_sentence():
    """0 K is -273.15 degC and -459.67 degF: SI brochure, 9th edition, 2.3.1, and the definition of the Fahrenheit scale."""
    celsius, fahrenheit = (Quantity("temperature").allowed(FileUnits("mm", "min", unit)) for unit in ("degC", "degF"))
    assert celsius.startswith("a temperature not below absolute zero (-273.15 degC), up to 99726")
    assert "<" not in celsius + fahrenheit
    assert "(-459.67 degF)" in fahrenheit
    assert Quantity("conductivity").allowed() == "conductivity above 0, up to 1e+06 W/(m K)"
    assert Quantity("fraction").allowed() == "fraction from 0 to 1"
