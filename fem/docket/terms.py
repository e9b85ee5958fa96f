"""The terms of a job besides its section: clock, start, wanted bands, allowance, variants."""

from typing import Any, ClassVar, Self

from pydantic import Field, model_validator
from pydantic_core import core_schema

from fem.docket.regions import Name, StartLike
from fem.quantities.strict import Strict, fault, raise_all
from fem.quantities.units import Heat, PositiveDuration, Seconds, TemperatureDifference, Time, reading, said

MOST_REPORTS = 100_000


class Clock(Strict):
    """When the job begins and ends, and how often it reports. A steady job has none: in a file ``steady = true``."""

    HINTS: ClassVar[dict[str, str]] = {"steady": "steady = true stands alone: drop it, or drop the rest of the clock"}

    begin: Time = Field(0.0, description="Clock time at the begin.")
    end: Time = Field(description="Clock time at the end.")
    report_every: PositiveDuration = Field(description="Time between two rows of the histories that are reported.")
    instants: tuple[Time, ...] = Field(
        (), max_length=10_000, description="Further clock times on which the march lands exactly."
    )

    @model_validator(mode="after")
    def _forward(self, info: core_schema.ValidationInfo) -> Self:
        units, faults = reading(info.context).units, []
        begin, end = said(self.begin, "time", units), said(self.end, "time", units)
        if not self.begin < self.end:
            faults.append(fault(("end",), end, f"a time after the begin, {begin}", "let the clock run on"))
        elif (self.end - self.begin) / self.report_every > MOST_REPORTS:
            every = said(self.report_every, "time", units)
            faults.append(fault(("report_every",), every, f"at most {MOST_REPORTS} reports", "report less often"))
        elif self.report_every > self.end - self.begin:
            every, length = (said(t, "time", units) for t in (self.report_every, self.end - self.begin))
            allowed = f"at most the {length} that the clock runs"
            faults.append(fault(("report_every",), every, allowed, "report more often, or let the clock run longer"))
        for i, t in enumerate(self.instants):
            if not self.begin <= t <= self.end:
                hint = "drop it, or let the clock run longer"
                faults.append(fault(("instants", i), said(t, "time", units), f"a time from {begin} to {end}", hint))
        raise_all("clock", faults)
        return self


class Start(Strict):
    """The state at the start; a region may state its own."""

    HINTS: ClassVar[dict[str, str]] = {"regions": 'write start = ... in the region\'s own table, "[[region]]"'}

    everywhere: StartLike | None = Field(None, description="Temperature of all regions that state none of their own.")


class Wanted(Strict):
    """How narrow the bands shall be."""

    gauges: TemperatureDifference = Field(1.0, description="At every gauge that states none of its own.")
    regions: TemperatureDifference | None = Field(
        None, description="On the highest and lowest temperature of each region."
    )
    means: TemperatureDifference | None = Field(None, description="On the mean temperature of each region.")
    heat: Heat | None = Field(None, description="On the heat through each exposure: W/m planar, W for a revolution.")
    stored: Heat | None = Field(None, description="On the stored heat: J/m planar, J for a revolution.")


class Allowance(Strict):
    """What the work may cost."""

    cells: int = Field(
        500_000, ge=100, le=5_000_000, description="Most cells of the finest mesh.", json_schema_extra={"unit": "cells"}
    )
    seconds: Seconds = Field(300.0, description="Longest wall time of the work; seconds in every file.")


class Variant(Strict):
    """The docket with some values changed, under a name."""

    name: Name = Field(description="The variant's name.")
    changes: dict[str, Any] = Field(
        min_length=1,
        description='Path in the file\'s terms ("region.deck.stock"), and value as in the file.',
    )
