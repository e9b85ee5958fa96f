"""Numbers for people: in the docket's units, rounded to what the band supports, never without it."""

import math
import re
from dataclasses import dataclass
from typing import Any, Self

from fem.quantities.units import FileUnits, said_place, scale_of
from fem.results.figures import Figures
from fem.results.history import Key
from fem.results.record import Record
from fem.results.rounding import digits, plain, rounded, span

FINEST_TEMPERATURE = -3
"""Decimal place below which no temperature is written: no thermometer of the trade resolves a millikelvin."""
NO_BAND_DECIMALS = 1
"""Decimals of a temperature that has no band."""
NO_BAND_DIGITS = 3
"""Significant digits of any other value that has no band."""

PREFIXES = ((1.0, ""), (1e3, "k"), (1e6, "M"), (1e9, "G"), (1e12, "T"))
SAME_INSTANT = 1e-9
"""Relative width below which a span of time is one instant."""
CLOCK_DIGITS = 4
"""An instant without a band is written to this many digits of the clock's length: it is a step of one run."""
START = "the start"
NUMBER = r"-?[0-9.]+(?:e[+-]?[0-9]+)?"
STRETCH = re.compile(rf"stretch:([^:]+):({NUMBER}),({NUMBER}):({NUMBER}),({NUMBER})")
"""The label of `fem.section.build.stretch_label`: region, start and end, m."""


@dataclass(frozen=True)
class Scale:
    """How numbers of one kind are written.

    Attributes
    ----------
    unit, step_unit : str
        Of a value, and of a difference of two, as a docket spells them.
    factor, offset : float
        SI value = factor * number + offset.
    """

    unit: str
    step_unit: str
    factor: float
    offset: float = 0.0

    def out(self, value: Any) -> Any:
        """Return an SI value, number or array, as a number in the unit."""
        return (value - self.offset) / self.factor

    def step(self, difference: Any) -> Any:
        """Return an SI difference (a band, a margin), number or array, as a number in the step's unit."""
        return difference / self.factor


KIND_OF = {
    "gauge": "temperature",
    "highest": "temperature",
    "lowest": "temperature",
    "mean": "temperature",
    "difference": "temperature difference",
    "rate": "heating rate",
    "flow": "flow",
    "heat": "heat",
    "made": "heat",
    "stored": "heat",
}
"""What the values of each kind of series are; "flow" and "heat" are W and J, per metre of depth in a planar section."""

TEMPERATURES = ("temperature", "temperature difference")


@dataclass(frozen=True)
class Writer:
    """Writes the numbers of one job in the units in which its docket speaks.

    Attributes
    ----------
    units : FileUnits
    steady, revolution : bool
        Of a steady state heat is told as W; in a planar section W and J are per metre of depth.
    """

    units: FileUnits
    steady: bool = False
    revolution: bool = False

    @classmethod
    def of(cls, record: Record) -> Self:
        """Return the writer of a record's numbers."""
        return cls(FileUnits(*record.units), steady=record.steady, revolution=record.revolution)

    def scale(self, kind: str) -> Scale:
        """Return how numbers of a kind (of `KINDS`, or "flow" or "heat") are written."""
        if kind in ("flow", "heat"):
            unit = "W" if kind == "flow" or self.steady else "J"
            unit += "" if self.revolution else "/m"
            return Scale(unit, unit, 1.0)
        unit = self.units.of(kind)
        factor, offset = scale_of(unit, kind)
        step = "temperature difference" if kind == "temperature" else kind
        return Scale(unit, self.units.of(step), float(factor), float(offset))

    def value(self, kind: str, value: float, band: float, *, signed: bool = False) -> str:
        """Return an SI value with its band, or with the words that it has none."""
        scale = self.scale(kind)
        number, wide = float(scale.out(value)), float(scale.step(band))
        prefix, factor = _prefix(kind, number, wide)
        number, wide, unit = number / factor, wide / factor, prefix + sign(scale.unit)
        plus = "+" if signed and number > 0 else ""
        if not math.isfinite(number):
            return "no value"
        if not math.isfinite(wide):
            bare = f"{number:.{NO_BAND_DECIMALS}f}" if kind in TEMPERATURES else digits(number, NO_BAND_DIGITS)
            return f"{plus}{bare} {unit}, no band"
        text, band_text = rounded(number, wide, FINEST_TEMPERATURE if kind in TEMPERATURES else None)
        return f"{plus}{text} ± {band_text} {unit}"

    def margin(self, margin: float, band: float, *, is_rate: bool) -> str:
        """Return a limit's margin with its band, in its unit."""
        return self.value("heating rate" if is_rate else "temperature difference", margin, band, signed=True)

    def heat(self, joule: float) -> str:
        """Return an entry of the heat ledger, an exact balance of the finest run rather than a value with a band."""
        scale = self.scale("heat")
        prefix, factor = _prefix("heat", joule, 0.0)
        return f"{plain(joule / factor)} {prefix}{scale.unit}"

    def time(self, seconds: float) -> str:
        """Return a finite instant or duration."""
        scale = self.scale("time")
        return f"{plain(float(scale.out(seconds)))} {scale.unit}"

    def time_span(self, middle: float, low: float, high: float) -> str:
        """Return an instant with the earliest and the latest that its band allows, all finite."""
        if high - low <= SAME_INSTANT * max(abs(high), abs(low)):
            return self.time(middle)
        scale = self.scale("time")
        text, start, end = span(*(float(scale.out(x)) for x in (middle, low, high)))
        return f"{text} ({start} to {end}) {scale.unit}"

    def instant(self, seconds: float, clock: tuple[float, float]) -> str:
        """Return an instant without a band, rounded to what the clock [s, from and to] makes worth telling."""
        begin, end = (float(self.scale("time").out(t)) for t in clock)
        places = max(CLOCK_DIGITS - 1 - math.floor(math.log10(end - begin)), 0)
        t = round(float(self.scale("time").out(seconds)), places)
        return START if t <= round(begin, places) else f"{t:.{places}f} {self.scale('time').unit}"

    def words(self, text: str) -> str:
        """Return a text with the labels of stretches in it written for people.

        Examples
        --------
        >>> Writer(FileUnits("mm", "min", "degC")).words("kiln on stretch:brick:0.5,0.06:0.5,0.114")
        'kiln on brick, (500, 60) to (500, 114) mm'
        """

        def written(label: re.Match[str]) -> str:
            x0, y0, x1, y1 = map(float, label.groups()[1:])
            start, end = said_place(x0, y0, self.units), said_place(x1, y1, self.units)
            return f"{label[1]}, {start.removesuffix(f' {self.units.length}')} to {end}"

        return STRETCH.sub(written, text)

    def crossing(self, middle: float, low: float, high: float) -> str:
        """Return when a temperature is reached, the earliest and the latest; infinite means not within the clock."""
        if math.isfinite(middle) and math.isfinite(low) and math.isfinite(high):
            return self.time_span(middle, low, high)
        if not math.isfinite(low):
            return "not reached within the clock"
        earliest = f"{self.time(low)} at the earliest"
        if not math.isfinite(middle):
            return f"not reached within the clock (the band allows it: {earliest})"
        return f"{self.time(middle)} ({earliest}, not certain within the clock)"

    def length(self, metres: float) -> str:
        """Return a length."""
        scale = self.scale("length")
        return f"{plain(float(scale.out(metres)))} {scale.unit}"

    def place(self, x: float, y: float) -> str:
        """Return a point of the section."""
        scale = self.scale("length")
        return f"({float(scale.out(x)):.5g}, {float(scale.out(y)):.5g}) {scale.unit}"

    def area(self, square_metres: float) -> str:
        """Return an area of the section."""
        scale = self.scale("length")
        return f"{plain(square_metres / scale.factor**2)} {scale.unit}²"


def sign(unit: str) -> str:
    """Return a unit as people write it.

    Examples
    --------
    >>> sign("delta_degF/min"), sign("degC")
    ('°F/min', '°C')
    """
    return unit.replace("delta_degF", "°F").replace("degC", "°C").replace("degF", "°F")


SERIES = {
    "gauge": "gauge {}",
    "highest": "highest in {}",
    "lowest": "lowest in {}",
    "mean": "mean of {}",
    "difference": "difference {}",
    "rate": "heating rate of {}",
    "flow": "heat flow in through {}",
    "heat": "heat in through {}",
    "made": "heat made in {}",
    "stored": "heat stored in {}",
}


def series_text(key: Key) -> str:
    """Return a series in words.

    Examples
    --------
    >>> series_text(Key("highest", "")), series_text(Key("heat", "kiln"))
    ('highest in the section', 'heat in through kiln')
    """
    return SERIES[key.kind].format(key.name or "the section")


def peak_text(writer: Writer, figures: Figures, key: Key, *, lowest: bool) -> tuple[str, str]:
    """Return a highest or lowest temperature and its instant as text; without a band the instant has no range.

    Where the band cannot tell the extreme from the start, the instant is the start, with how late it may be.
    """
    peak, begin, end = figures.peak(key, lowest=lowest), float(figures.grid.t[0]), float(figures.grid.t[-1])
    value = writer.value("temperature", peak.value, peak.band)
    if not math.isfinite(peak.band):
        return value, writer.instant(peak.t, (begin, end)) if end > begin else START
    first = float(figures.series(key)[0][0])
    if peak.t_low <= begin and abs(first - peak.value) <= peak.band:
        late = writer.instant(peak.t_high, (begin, end))
        return value, START if late == START else f"{START} (or up to {late})"
    return value, writer.time_span(peak.t, peak.t_low, peak.t_high)


def _prefix(kind: str, value: float, band: float) -> tuple[str, float]:
    """Return the decimal prefix that leaves one to three digits before the point; only heat and its flow carry one."""
    if kind not in ("flow", "heat"):
        return "", 1.0
    largest = max((abs(x) for x in (value, band) if math.isfinite(x)), default=0.0)
    factor, name = next((pair for pair in reversed(PREFIXES) if largest >= pair[0]), PREFIXES[0])
    return name, factor
