"""What all schedules share: values of the field's own kind, and polylines that end where they end."""

import math
from abc import abstractmethod
from typing import Annotated, Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field
from pydantic_core import InitErrorDetails, core_schema

from fem.errors import refusal
from fem.laws import Law
from fem.quantities.strict import Strict, fault
from fem.quantities.units import FileUnits, Quantity, Time, reading, said
from fem.schedules.polyline import polyline
from fem.stock.properties import read_pasted

Floats = NDArray[np.float64]


class OwnKind:
    """Marks a number that is of its schedule's own kind: a temperature in an ambient, W/m2 in a flux.

    A schedule that is made on its own in Python does not know its kind yet: numbers are SI, and text with a unit waits
    as text until the schedule stands in a docket.
    """

    def __init__(self, *, difference: bool = False) -> None:
        self.difference = difference

    def _validate(self, value: Any, info: core_schema.ValidationInfo) -> float | str:
        context = reading(info.context)
        kind = context.kind
        if not kind:
            return value if isinstance(value, str) else Quantity("number").read(value)
        if not self.difference:
            return Quantity(kind).read(value, context.units)
        return Quantity(self.kind_in(kind), lowest=0.0, open_low=True).read(value, context.units)

    def kind_in(self, kind: str) -> str:
        """Return what the number is in a schedule of this kind."""
        return "temperature difference" if self.difference and kind == "temperature" else kind

    def __get_pydantic_core_schema__(self, _source: Any, _handler: Any) -> core_schema.CoreSchema:
        """Tell pydantic to read the field through this mark."""
        return core_schema.with_info_plain_validator_function(self._validate)


Value = Annotated[float, OwnKind()]
Difference = Annotated[float, OwnKind(difference=True)]
Outside = Literal["refuse", "hold"]
Row = tuple[Time, Value]


class Schedule(Strict):
    """The base of all schedules."""

    @abstractmethod
    def law(self, begin: float, end: float) -> Law:
        """Return the schedule as a law; its breaks are complete from begin to end, s."""

    def span(self) -> tuple[float, float]:
        """Return the times, s, between which the schedule says something; infinite where it always does."""
        return -math.inf, math.inf

    @property
    def varies(self) -> bool:
        """True when the value depends on time."""
        return True


class Knotted(Schedule):
    """A schedule that is straight between knots, and that ends."""

    starts_at: Time = Field(0.0, description="The clock time at which the schedule's own time is zero.")
    before: Outside = Field("refuse", description='What stands before the first time: "refuse", or "hold" its value.')
    after: Outside = Field("refuse", description='What stands after the last time: "refuse", or "hold" its value.')

    @abstractmethod
    def knots(self) -> tuple[Floats, Floats]:
        """Return times, s on the clock, and values, SI; both (n,), a time given twice is a jump."""

    def law(self, begin: float, end: float) -> Law:  # noqa: ARG002 - knots do not depend on the clock
        """Return the polyline through the knots."""
        t, v = self.knots()
        hold = (self.before == "hold", self.after == "hold")
        return polyline(t, v, hold_before=hold[0], hold_after=hold[1], name=type(self).__name__.lower())

    @classmethod
    def to_short(cls, table: dict[str, Any]) -> Any:
        """Return the table with what names the schedule first."""
        later = ("starts_at", "before", "after")
        return {k: v for k, v in table.items() if k not in later} | {k: table[k] for k in later if k in table}

    def span(self) -> tuple[float, float]:
        """Return the first and the last time, infinite where held."""
        t, _ = self.knots()
        first, last = float(t[0]), float(t[-1])
        return -math.inf if self.before == "hold" else first, math.inf if self.after == "hold" else last


def pasted(value: Any) -> Any:
    """Return the rows of a table that was pasted as text."""
    if not isinstance(value, str):
        return value
    try:
        return read_pasted(value)
    except ValueError as error:
        raise refusal("rows of time and value", str(error)) from error


def order_faults(key: str, rows: tuple[tuple[float, float], ...], units: FileUnits) -> list[InitErrorDetails]:
    """Return the faults in the times of a table: going back, or more than two rows at one time."""
    faults = []
    times = [row[0] for row in rows]
    for i in range(1, len(times)):
        value = said(times[i], "time", units)
        if times[i] < times[i - 1]:
            allowed, hint = "a time not before that of the row above", "sort the rows by time"
            faults.append(fault((key, i, 0), value, allowed, hint))
        elif i > 1 and times[i] == times[i - 1] == times[i - 2]:
            allowed, hint = "a time at most twice, for a jump", "drop the middle row"
            faults.append(fault((key, i, 0), value, allowed, hint))
    return faults
