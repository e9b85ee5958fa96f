"""Numbers for people: the interval written holds the interval computed, and nothing is written bare."""

import math
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from fem.docket import Stretch
from fem.quantities.units import FileUnits
from fem.results.bands import Grid
from fem.results.figures import Figures
from fem.results.history import Key
from fem.results.numbers import Writer, peak_text, series_text
from fem.results.rounding import rounded, span
from fem.section.build import stretch_label

METRIC = Writer(FileUnits("mm", "min", "degC"))
IMPERIAL = Writer(FileUnits("in", "h", "degF"))
finite = st.floats(-1e9, 1e9, allow_nan=False)
wide = st.floats(1e-9, 1e6)


@given(finite, wide)
def test_written_interval_holds_the_computed_one(value, band):
    text, band_text = (Decimal(x) for x in rounded(value, band))
    step = Decimal(1).scaleb(band_text.as_tuple().exponent)
    grace = step / 10**6  # what binary floats leave of a decimal
    assert text - band_text <= Decimal(value) - Decimal(band) + grace
    assert text + band_text >= Decimal(value) + Decimal(band) - grace


@given(finite, wide)
def test_rounding_widens_a_band_by_little(value, band):
    """Two digits rounded up, plus half a digit of the value: 1.5 units of the second digit, 15 % of a band of 10."""
    assume(band > 1e-4 * abs(value))  # a narrower one would need a seventh digit of the value
    assert float(rounded(value, band)[1]) <= 1.15 * band * (1 + 1e-9)


@given(finite, wide)
def test_value_and_band_end_at_the_same_place(value, band):
    ends = {Decimal(x).as_tuple().exponent if "." in x else 0 for x in rounded(value, band)}
    assert len(ends) == 1


def test_gum_example_of_rounding():
    """JCGM 100:2008, 7.2.6: u = 10.47 mOhm is rounded up to 11 mOhm."""
    assert rounded(10057.62, 10.47)[1] == "11"


def test_no_band_is_written_as_nothing():
    assert rounded(20.0, 0.0, -3) == ("20.000", "0.001")
    assert METRIC.value("temperature", 293.15, 0.0) == "20.000 ± 0.001 °C"


@given(st.floats(0, 1e6), st.floats(1e-6, 1e5), st.floats(0, 1))
def test_written_span_holds_the_computed_one(low, width, part):
    high = low + width
    assume(high - low > 1e-9 * high)
    middle, start, end = (Decimal(x) for x in span(low + part * (high - low), low, high))
    grace = Decimal(width) / 10**6
    assert start <= Decimal(low) + grace
    assert end >= Decimal(high) - grace
    assert start <= middle <= end


@pytest.mark.parametrize(
    ("writer", "kind", "value", "band", "text"),
    [
        (METRIC, "temperature", 373.15, 1.0, "100.0 ± 1.0 °C"),  # SI: 0 °C is 273.15 K, a step of 1 °C one of 1 K
        (IMPERIAL, "temperature", 373.15, 1.0, "212.0 ± 1.8 °F"),  # 1 K is 1.8 °F exactly
        (Writer(FileUnits()), "temperature", 373.15, 1.0, "373.1 ± 1.1 K"),
        (IMPERIAL, "temperature difference", 10.0, 1.0, "18.0 ± 1.8 °F"),
        (METRIC, "heating rate", 1.0, 0.1, "60.0 ± 6.0 K/min"),
        (IMPERIAL, "heating rate", 1.0, 0.1, "6480 ± 650 °F/h"),
        (METRIC, "heat", 12.3456e6, 1.2e4, "12.346 ± 0.013 MJ/m"),
        (METRIC, "flow", -1500.0, 20.0, "-1.500 ± 0.020 kW/m"),
        (Writer(FileUnits(), revolution=True), "heat", 1500.0, 20.0, "1.500 ± 0.020 kJ"),
        (Writer(FileUnits(), steady=True), "heat", 1500.0, 20.0, "1.500 ± 0.020 kW/m"),
    ],
)
def test_value_speaks_the_dockets_units(writer, kind, value, band, text):
    assert writer.value(kind, value, band) == text


@pytest.mark.parametrize("kind", ["temperature", "temperature difference", "heating rate", "heat", "flow"])
def test_value_without_a_band_says_so(kind):
    assert METRIC.value(kind, 345.678, math.inf).endswith(", no band")
    assert METRIC.value(kind, math.nan, 1.0) == "no value"


def test_margin_carries_its_sign():
    assert METRIC.margin(12.0, 1.0, is_rate=False) == "+12.0 ± 1.0 K"
    assert METRIC.margin(-12.0, 1.0, is_rate=False) == "-12.0 ± 1.0 K"
    assert METRIC.margin(-0.1, 0.01, is_rate=True) == "-6.00 ± 0.60 K/min"


def test_crossing_says_what_is_not_certain():
    assert METRIC.crossing(600.0, 540.0, 720.0) == "10.0 (9.0 to 12.0) min"
    assert METRIC.crossing(600.0, 600.0, 600.0) == "10 min"
    assert "not certain within the clock" in METRIC.crossing(600.0, 540.0, math.inf)
    assert METRIC.crossing(math.inf, 540.0, math.inf).startswith("not reached within the clock (the band allows it")
    assert METRIC.crossing(math.inf, math.inf, math.inf) == "not reached within the clock"


def history(t, celsius, band):
    """Figures of one gauge."""
    t, value = np.array(t), np.array([celsius]) + 273.15
    n = np.arange(len(t))
    grid = Grid(t, np.full(len(t), -1), t * 0.0, t * 0.0 + t[-1], np.full(len(t), fill_value=True), n, n)
    return Figures((WEB,), grid, value, np.full(value.shape, band), np.zeros(value.shape), np.full(value.shape, 2.0))


WEB = Key("gauge", "web")


def test_peak_gives_no_span_without_a_band():
    times, values = [0.0, 540.0, 600.0, 720.0, 1800.0], [20.0, 98.5, 100.0, 98.5, 50.0]
    told = peak_text(METRIC, history(times, values, 1.0), WEB, lowest=False)
    assert told == ("100.0 ± 1.0 °C", "10.0 (9.0 to 12.0) min")
    told = peak_text(METRIC, history(times, values, math.inf), WEB, lowest=False)
    assert told == ("100.0 °C, no band", "10.00 min")


@pytest.mark.parametrize("first", [7.6294e-05 * 60.0, 0.00011444 * 60.0])
def test_extreme_in_the_first_step_of_one_run_is_at_the_start(first):
    told = history([0.0, first, 60000.0], [20.0, 19.999999, 90.0], math.inf)
    assert peak_text(METRIC, told, WEB, lowest=True) == ("20.0 °C, no band", "the start")


def test_instant_without_a_band_has_no_more_digits_than_the_clock_is_worth():
    assert METRIC.instant(841.25 * 60.0, (0.0, 1080.0 * 60.0)) == "841 min"
    assert METRIC.instant(8.4125 * 60.0, (0.0, 10.0 * 60.0)) == "8.41 min"
    assert METRIC.instant(0.0, (-600.0, 600.0)) == "0.00 min"  # the clock began before nought


def test_extreme_that_the_band_cannot_tell_from_the_start_is_at_the_start():
    times = [0.0, 120.0, 780.0, 1800.0]
    told = history(times, [20.0, 19.999, 20.01, 90.0], 0.008)
    assert peak_text(METRIC, told, WEB, lowest=True) == ("19.999 ± 0.008 °C", "the start (or up to 13.00 min)")
    told = history(times, [20.0, 21.0, 22.0, 90.0], 0.008)
    assert peak_text(METRIC, told, WEB, lowest=True)[1] == "the start"
    told = history([0.0, 1.2, 120.0, 1800.0], [20.0, 19.999, 22.0, 90.0], 0.008)  # 0.02 min rounds to the begin or not
    assert peak_text(METRIC, told, WEB, lowest=True)[1] == "the start (or up to 0.02 min)"
    told = history([0.0, 0.12, 120.0, 1800.0], [20.0, 19.999, 22.0, 90.0], 0.008)
    assert peak_text(METRIC, told, WEB, lowest=True)[1] == "the start"
    told = history(times, [20.0, 15.0, 22.0, 90.0], 0.008)
    assert peak_text(METRIC, told, WEB, lowest=True)[1] == "2 min"


def test_stretches_are_named_in_the_dockets_units():
    label = stretch_label(Stretch(region="insulating brick", start=(0.5, -1e-7), end=(0.5, 0.114)))
    assert METRIC.words(f"rim on {label}") == "rim on insulating brick, (500, -0.0001) to (500, 114) mm"
    assert METRIC.words("deck.top") == "deck.top"


def test_inputs_are_written_whole():
    assert METRIC.length(0.5) == "500 mm"
    assert METRIC.area(0.03) == "30000 mm²"
    assert METRIC.area(3.0) == "3000000 mm²"
    assert METRIC.place(0.25, -0.1) == "(250, -100) mm"


def test_series_has_words_for_every_kind():
    assert series_text(Key("gauge", "web")) == "gauge web"
    with pytest.raises(KeyError):
        series_text(Key("colour", "web"))
