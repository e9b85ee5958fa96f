"""The only conversions: what a file or a user writes becomes SI and kelvin here, and nowhere else.

Conversions are exact rational arithmetic rounded once, so ``12 mm`` and ``0.012 m`` are the same float. A bare number
in a file is in the file's units (validation context); in Python, where there is no file, it is SI and kelvin. Units
come from pint, whose constants follow BIPM, *The International System of Units*, 9th edition, and NIST SP 811.
"""

import functools
import math
import numbers
import re
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, Any

from pydantic_core import core_schema

from fem.errors import Said, refusal
from fem.quantities.file_units import LENGTHS, SI, TEMPERATURES, TIMES, FileUnits, Reading, reading
from fem.quantities.kinds import KINDS
from fem.quantities.unit_text import is_unit_text, tidy_unit

__all__ = [
    "LENGTHS",
    "SI",
    "TEMPERATURES",
    "TIMES",
    "Conductivity",
    "Density",
    "Duration",
    "FileUnits",
    "FilmCoefficient",
    "Flux",
    "Fraction01",
    "Heat",
    "Length",
    "Number",
    "PositiveDuration",
    "PositiveLength",
    "Quantity",
    "Rate",
    "Reading",
    "Seconds",
    "SpecificHeat",
    "Temperature",
    "TemperatureDifference",
    "Time",
    "VolumePower",
    "celsius",
    "in_unit",
    "reading",
    "said",
    "scale_of",
    "to_si",
    "written",
]


@functools.cache
def _registry() -> Any:
    import pint  # costs 0.3 s: only a docket that is really read pays for it

    return pint.UnitRegistry(non_int_type=Fraction)


@functools.lru_cache(maxsize=512)
def _scale(unit: str, si: str) -> tuple[Fraction, Fraction]:
    """Return (factor, offset) with SI value = factor * number + offset, exactly.

    Raises
    ------
    ValueError
        If the unit is unknown or of another dimension.
    """
    tidy = tidy_unit(unit)
    if not is_unit_text(tidy):
        raise ValueError("not a unit")
    registry = _registry()
    try:
        here, there = registry.parse_units(tidy), registry.parse_units(si)
        zero = registry.Quantity(Fraction(0), here).to(there).magnitude
        one = registry.Quantity(Fraction(1), here).to(there).magnitude
    except Exception as error:  # pint raises a dozen unrelated types for a text that is no unit
        raise ValueError("unknown, or of another dimension") from error
    return Fraction(one) - Fraction(zero), Fraction(zero)


def scale_of(unit: str, kind: str) -> tuple[Fraction, Fraction]:
    """Return (factor, offset) of numbers of this kind in this unit: SI value = factor * number + offset, exactly.

    Raises
    ------
    ValueError
        If the unit is unknown or of another dimension.
    """
    what = KINDS[kind]
    if kind == "heat":
        if unit == what.si:
            return Fraction(1), Fraction(0)
        raise ValueError("a plain number")
    factor, offset = _scale(unit or "dimensionless", what.si or "dimensionless")
    return factor, offset if what.absolute else Fraction(0)  # "5 degC" as a difference: the scale's zero plays no part


def to_si(number: float, unit: str, kind: str) -> float:
    """Return a number in a unit as SI, correctly rounded; the number means its shortest decimal.

    Raises
    ------
    ValueError
        If the unit is unknown or of another dimension, or the result is too large for a float.
    """
    factor, offset = scale_of(unit, kind)
    try:
        return float(Fraction(repr(float(number))) * factor + offset)
    except OverflowError as error:
        raise ValueError("too large") from error


def celsius(kelvin: Any) -> Any:
    """Return temperatures in K, number or array, as degC, for pictures and printed tables."""
    return kelvin - 273.15


def _is_number(value: Any) -> bool:
    return isinstance(value, numbers.Real) and not isinstance(value, bool)


def _finite(value: Any) -> bool:
    try:
        return math.isfinite(value)
    except OverflowError:  # a whole number beyond every float
        return False


_NUMBER = re.compile(r"\s*([+-]?(?:\d{1,30}\.?\d{0,30}|\.\d{1,30})(?:[eE][+-]?\d{1,3})?)\s*(.*?)\s*", re.DOTALL)


def _parse(text: str, kind: str, units: FileUnits) -> float:
    """Return a text as SI; without a unit it is a bare number, as pasted from a spreadsheet.

    Raises
    ------
    PydanticCustomError
        With what is allowed and how to mend it.
    """
    what = KINDS[kind]
    allowed = f"a {what.name} as a number or as text with its unit, such as {what.examples}"
    match = _NUMBER.fullmatch(text)
    if match is None:
        comma = re.match(r"\s*[+-]?\d+,\d", text)
        raise refusal(allowed, "write a decimal point, not a comma" if comma else "write a number, then its unit")
    number, unit = match.groups()
    if unit.startswith(","):
        raise refusal(allowed, "write a decimal point, not a comma")
    try:
        factor, offset = scale_of(unit or units.of(kind), kind)
    except ValueError as error:
        raise refusal(allowed, f'"{unit}" is not a unit of {what.name} that is known here') from error
    try:
        return float(Fraction(number) * factor + offset)
    except OverflowError as error:
        raise refusal(allowed, "write a smaller number") from error


@dataclass(frozen=True)
class Quantity:
    """Marks a pydantic field as a number of one kind: converts to SI, refuses what is not finite or out of bounds.

    Attributes
    ----------
    kind : str
        A key of `KINDS`.
    lowest, highest : float or None
        Bounds in SI that replace those of the kind.
    open_low : bool or None
        Replaces that of the kind.
    """

    kind: str
    lowest: float | None = None
    highest: float | None = None
    open_low: bool | None = None

    @property
    def bounds(self) -> tuple[float, float, bool]:
        """Lowest and highest value allowed, SI, and whether the lowest itself is refused."""
        what = KINDS[self.kind]
        low = what.lowest if self.lowest is None else self.lowest
        high = what.highest if self.highest is None else self.highest
        return low, high, what.open_low if self.open_low is None else self.open_low

    def read(self, value: Any, units: FileUnits = SI) -> float:
        """Return the value in SI.

        Raises
        ------
        PydanticCustomError
            If it is not a finite number or a text with a fitting unit within bounds.
        """
        what = KINDS[self.kind]
        if isinstance(value, str):
            number = _parse(value, self.kind, units)
        elif _is_number(value):
            if not _finite(value):
                raise refusal(f"a finite {what.name}", "write a number")
            try:
                number = float(value) if units is SI else to_si(float(value), units.of(self.kind), self.kind)
            except (ValueError, OverflowError) as error:
                raise refusal(self.allowed(units), "write a smaller number") from error
        else:
            raise refusal(
                f"a {what.name}: a number, or text with its unit such as {what.examples}", "write one of these"
            )
        low, high, open_low = self.bounds
        if not (low < number if open_low else low <= number) or number > high:
            raise refusal(self.allowed(units), "check the number and its unit")
        return number

    def allowed(self, units: FileUnits = SI) -> str:
        """Return the bounds as a message states them, in the file's units."""
        low, high, open_low = self.bounds
        unit, what = units.of(self.kind), KINDS[self.kind]
        ends = [f"{in_unit(end, unit, self.kind):.6g}" for end in (low, high)]
        label = unit.removeprefix("delta_")
        if what.absolute and low == 0.0:
            return f"a {what.name} not below absolute zero ({ends[0]} {label}), up to {ends[1]} {label}"
        start = f"above {ends[0]}, up to" if open_low else f"from {ends[0]} to"
        return f"{what.name} {start} {ends[1]} {label}".rstrip()

    def _validate(self, value: Any, info: core_schema.ValidationInfo) -> float:
        return self.read(value, reading(info.context).units)

    def __get_pydantic_core_schema__(self, _source: Any, _handler: Any) -> core_schema.CoreSchema:
        """Tell pydantic to read the field through this mark."""
        return core_schema.with_info_plain_validator_function(self._validate)


def in_unit(value: float, unit: str, kind: str) -> float:
    """Return an SI value as a number in the unit, correctly rounded.

    Raises
    ------
    ValueError
        If the unit is not one of this kind.
    """
    factor, offset = scale_of(unit, kind)
    return float((Fraction(float(value)) - offset) / factor)


def said(value: float, kind: str, units: FileUnits = SI) -> Said:
    """Return an SI value for a message, in the file's units: ``720 min``."""
    unit = units.of(kind)
    return Said(f"{in_unit(value, unit, kind):.6g} {unit.removeprefix('delta_')}".rstrip())


def said_place(x: float, y: float, units: FileUnits = SI) -> Said:
    """Return a point of the section, m, for a message, in the file's units: ``(500, 60) mm``."""
    unit = units.of("length")
    return Said(f"({in_unit(x, unit, 'length'):.6g}, {in_unit(y, unit, 'length'):.6g}) {unit}")


def written(value: float, kind: str, units: FileUnits) -> float | int | str:
    """Return an SI value as a file states it: the shortest decimal in the file's units that reads back to it exactly.

    Where no such decimal exists (a temperature so low that the offset swallows its digits) it is text with the SI unit.
    """
    unit = units.of(kind)
    factor, offset = scale_of(unit, kind)
    exact = float((Fraction(value) - offset) / factor)
    plain = [f"{exact:.{places}f}" for places in range(7)]  # 0, not -1e-14, for 273.15 K in degC
    for text in plain + [f"{exact:.{digits}g}" for digits in range(1, 18)]:
        number = float(text) + 0.0
        if to_si(number, unit, kind) == value:
            return int(number) if number.is_integer() and abs(number) < LARGEST_INTEGER else number
    return f"{value!r} {KINDS[kind].si}"


LARGEST_INTEGER = 1e15
"""Below it every whole float is written as a whole number."""

Length = Annotated[float, Quantity("length")]
PositiveLength = Annotated[float, Quantity("length", 0.0, open_low=True)]
Time = Annotated[float, Quantity("time")]
Duration = Annotated[float, Quantity("time", 0.0)]
PositiveDuration = Annotated[float, Quantity("time", 0.0, open_low=True)]
Temperature = Annotated[float, Quantity("temperature")]
TemperatureDifference = Annotated[float, Quantity("temperature difference", open_low=True)]
Rate = Annotated[float, Quantity("heating rate")]
Flux = Annotated[float, Quantity("heat flux")]
FilmCoefficient = Annotated[float, Quantity("film coefficient")]
VolumePower = Annotated[float, Quantity("heat source")]
Conductivity = Annotated[float, Quantity("conductivity")]
Density = Annotated[float, Quantity("density")]
SpecificHeat = Annotated[float, Quantity("specific heat")]
Fraction01 = Annotated[float, Quantity("fraction")]
Number = Annotated[float, Quantity("number")]
Seconds = Annotated[float, Quantity("seconds")]
Heat = Annotated[float, Quantity("heat")]
