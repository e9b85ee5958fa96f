"""The schedule that a logger wrote: a column of a CSV file beside the docket."""

from typing import Self

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator
from pydantic_core import InitErrorDetails, core_schema

from fem.errors import DocketError, Said, refusal, shown
from fem.quantities.kinds import KINDS
from fem.quantities.strict import fault, raise_all, raise_one
from fem.quantities.units import Number, PositiveDuration, Quantity, Reading, reading, scale_of
from fem.schedules.base import Difference, Knotted
from fem.schedules.log_folder import LogFolder
from fem.schedules.logs import Samples, Wanted
from fem.schedules.polyline import thin

Floats = NDArray[np.float64]


class Log(Knotted):
    """A column of a CSV file against its time column, straight between the rows.

    In a docket the file is read when the docket is; `samples` then holds what stood in it.
    """

    log: str = Field(min_length=1, max_length=255, description="The CSV file, relative to the docket's folder.")
    time: str = Field(min_length=1, description="Name of the time column: numbers, or ISO time stamps.")
    column: str = Field(min_length=1, description="Name of the column that holds the values.")
    time_unit: str | None = Field(
        None, description="Unit of a time column of numbers; the file's unit of time by default."
    )
    unit: str | None = Field(
        None, description="Unit of the values; the unit of a bare number at this place by default."
    )
    scale: Number = Field(1.0, description="Factor, of no unit, on the values in their unit; not for temperatures.")
    jumps: bool = Field(
        default=False, description="Whether a time that is given twice is a jump; otherwise it is refused."
    )
    max_gap: PositiveDuration | None = Field(None, description="Longest time between two rows that is not a gap.")
    thin: Difference | None = Field(
        None, description="Rows may be left out as long as the line through the rest moves by no more than this."
    )
    kind: str = Field("", exclude=True, repr=False, description="What the values are; known where the log stands.")
    samples: Samples | None = Field(
        None, exclude=True, repr=False, description="What was read, in the file's units; SI time."
    )

    @model_validator(mode="after")
    def _read(self, info: core_schema.ValidationInfo) -> Self:
        context = reading(info.context)
        if not context.kind:
            return self
        object.__setattr__(self, "kind", context.kind)
        self._settle_units(context)
        if self.samples is None and isinstance(context.logs, LogFolder):
            try:
                object.__setattr__(self, "samples", context.logs.samples(self.log, self._wanted()))
            except DocketError as error:
                raise_all("log", [fault((p.place,), Said(p.value), p.allowed, p.hint) for p in error.problems])
        raise_all("log", self._out_of_bounds())
        return self

    def _wanted(self) -> Wanted:
        return Wanted(self.time, self.column, self.time_unit or "s", self.jumps, self.max_gap)

    def reads(self, logs: LogFolder) -> bool:
        """Return whether the log found there holds the same numbers as this one.

        Raises
        ------
        DocketError
            If it can't be read.
        """
        return logs.samples(self.log, self._wanted()) == self.samples

    def _settle_units(self, context: Reading) -> None:
        """Fix the units that were left out, so that the log means the same wherever the docket goes."""
        kind = context.kind
        for name, what in (("time_unit", "time"), ("unit", kind)):
            given = getattr(self, name)
            if given is None:
                object.__setattr__(self, name, context.units.of(what))
                continue
            try:
                scale_of(given, what)
            except ValueError:
                allowed = f"a unit of {KINDS[what].name}, as in {KINDS[what].examples}"
                raise_one((name,), given, allowed, "write the unit alone, in quotes")
        if self.scale != 1.0 and kind == "temperature":
            raise refusal(
                "scale for values other than temperatures", "scale the column in the file, where its zero is known"
            )

    def _values(self) -> Floats:
        """Return the values in SI, (n,)."""
        if self.samples is None or self.unit is None:
            raise DocketError.single(
                f"log {shown(self.log)}", "", "a log that stands in a docket", "put it into a docket"
            )
        factor, offset = scale_of(self.unit, self.kind)
        return self.samples.v * self.scale * factor.numerator / factor.denominator + float(offset)

    def _out_of_bounds(self) -> list[InitErrorDetails]:
        if self.samples is None:
            return []
        mark = Quantity(self.kind)
        low, high, open_low = mark.bounds
        v = self._values()
        bad = np.flatnonzero((v <= low if open_low else v < low) | (v > high))
        if not len(bad):
            return []
        worst = int(bad[0])
        value = f"{self.samples.v[worst]:g} {self.unit} at {self.samples.t[worst]:g} s, and {len(bad) - 1} more"
        return [
            fault((f"{self.log}, column {shown(self.column)}",), value, mark.allowed(), "check the column and its unit")
        ]

    def kept(self) -> NDArray[np.intp]:
        """Return the indices of the rows that the law uses: all of them, or those that thinning keeps."""
        v = self._values()
        if self.thin is None or self.samples is None:
            return np.arange(len(v))
        return thin(self.samples.t, v, self.thin)

    def knots(self) -> tuple[Floats, Floats]:
        """Return times, s on the clock, and values, SI, of the rows that are kept."""
        v, keep = self._values(), self.kept()
        assert self.samples is not None  # noqa: S101 - _values refuses a log without samples
        return self.samples.t[keep] + self.starts_at, v[keep]
