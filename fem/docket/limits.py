"""Gauges, and the limits that are judged against the bands of their histories."""

from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import BeforeValidator, Field, model_validator
from pydantic_core import core_schema

from fem.docket.regions import DotlessName, Name
from fem.errors import Said, refusal
from fem.quantities.strict import Strict, fault, raise_all, raise_one
from fem.quantities.units import (
    FileUnits,
    Length,
    PositiveDuration,
    Rate,
    Temperature,
    TemperatureDifference,
    Time,
    reading,
    said,
)

Must = Literal[
    "reach", "stay below", "stay above", "hold above", "heat slower than", "cool slower than", "differ less than"
]
GAUGE_ONLY = ("heat slower than", "cool slower than", "differ less than")
"""Limits that make sense at a gauge only: the hottest point of a region moves, so it has no rate and no partner."""

NEEDED: dict[str, tuple[str, ...]] = {
    "reach": ("temperature",),
    "stay below": ("temperature",),
    "stay above": ("temperature",),
    "hold above": ("temperature", "at_least"),
    "heat slower than": ("rate",),
    "cool slower than": ("rate",),
    "differ less than": ("other", "below"),
}
OPTIONAL: dict[str, tuple[str, ...]] = {
    "reach": ("within",),
    "heat slower than": ("over", "during"),
    "cool slower than": ("over", "during"),
}
"""Where not listed: `during`."""


def _place(value: Any) -> Any:
    """Return what stands at `at` if it is a text.

    Raises
    ------
    PydanticCustomError
        Otherwise: a point is a gauge's business.
    """
    if not isinstance(value, str):
        allowed = "a gauge's or region's name, or \"anywhere\""
        raise refusal(allowed, "make a [[gauge]] there and write its name; a name stands in quotes")
    return value


At = Annotated[str, BeforeValidator(_place)]


class Gauge(Strict):
    """A point whose temperature history is recorded: where a thermocouple sits, or would. In a file ``at = [x, y]``."""

    HINTS: ClassVar[dict[str, str]] = {"at": "write at = [x, y]"}
    SPELLED: ClassVar[dict[str, str]] = {"x": "at", "y": "at"}

    name: Name = Field(description="The gauge's name.")
    x: Length = Field(description="Across the section.")
    y: Length = Field(description="Up the section.")
    region: DotlessName | None = Field(None, description="The region it belongs to, where it lies on a border.")
    band: TemperatureDifference | None = Field(
        None, description="Band wanted here, where it differs from that of all gauges."
    )

    @classmethod
    def file_keys(cls) -> tuple[str, ...]:
        """Return the keys that a file may use."""
        return tuple(key for key in ("at", *super().file_keys()) if key not in ("x", "y"))

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Read at = [x, y]."""
        if not isinstance(data, dict) or "at" not in data:
            return data
        at = data["at"]
        if not isinstance(at, list | tuple) or len(at) != 2:
            raise_one(("at",), at, "[x, y]", "write the two coordinates of the gauge")
        return {**{key: value for key, value in data.items() if key != "at"}, "x": at[0], "y": at[1]}

    @classmethod
    def to_short(cls, table: dict[str, Any]) -> Any:
        """Write x and y as at = [x, y]."""
        rest = {key: value for key, value in table.items() if key not in ("name", "x", "y")}
        return {"name": table["name"], "at": [table["x"], table["y"]], **rest}


class Limit(Strict):
    """What must hold, at a gauge, in a region or anywhere.

    In a region or anywhere, "stay below" looks at the hottest point, the others at the coldest. Rates are means over
    `over`, by default the reporting interval.
    """

    name: Name = Field(description="The limit's name.")
    at: At = Field(min_length=1, description='A gauge, a region, or "anywhere" for the whole section.')
    must: Must = Field(description="What must hold.")
    temperature: Temperature | None = Field(None, description="Temperature to reach, hold or keep from.")
    within: PositiveDuration | None = Field(None, description="How long after the begin it must be reached.")
    at_least: PositiveDuration | None = Field(None, description="How long it must be held, on end.")
    rate: Rate | None = Field(None, description="Largest rate of heating or cooling, above zero.")
    over: PositiveDuration | None = Field(None, description="Span over which a rate is averaged.")
    other: Name | None = Field(None, description="The gauge to compare with.")
    below: TemperatureDifference | None = Field(None, description="Largest difference between the two gauges.")
    during: tuple[Time, Time] | None = Field(None, description="Clock times between which the limit is in force.")

    @model_validator(mode="after")
    def _whole(self, info: core_schema.ValidationInfo) -> Self:
        needed = NEEDED[self.must]
        allowed = (*needed, *OPTIONAL.get(self.must, ("during",)))
        faults = []
        for key in ("temperature", "within", "at_least", "rate", "over", "other", "below", "during"):
            value = getattr(self, key)
            if key in needed and value is None:
                faults.append(fault((key,), None, f'{" and ".join(needed)} for "{self.must}"', f"add {key}"))
            if key not in allowed and value is not None:
                faults.append(fault((key,), None, f'{", ".join(allowed)} for "{self.must}"', f"drop {key}"))
        if self.during is not None and not self.during[0] < self.during[1]:
            units = reading(info.context).units
            times = Said(" to ".join(said(t, "time", units) for t in self.during))
            faults.append(fault(("during",), times, "a first time before the second", "swap the two"))
        if self.other is not None and self.other == self.at:
            faults.append(fault(("other",), self.other, "another gauge", "name the gauge to compare with"))
        raise_all("limit", faults)
        return self

    def sentence(self, units: FileUnits, *, span: float | None = None) -> str:
        """Return the limit as a sentence in the units of the docket; `span`: over which a rate is averaged, s."""
        where = self.at if self.at == "anywhere" else f'"{self.at}"'
        text = f"{where} must {self.must}"
        if self.other is not None and self.below is not None:
            difference = said(self.below, "temperature difference", units)
            text = f'{where} must differ from "{self.other}" by less than {difference}'
        if self.temperature is not None:
            text += f" {said(self.temperature, 'temperature', units)}"
        if self.rate is not None:
            text += f" {said(self.rate, 'heating rate', units)}"
        if span is not None:
            text += f", averaged over {said(span, 'time', units)},"
        if self.within is not None:
            text += f" within {said(self.within, 'time', units)}"
        if self.at_least is not None:
            text += f" for at least {said(self.at_least, 'time', units)}"
        if self.during is not None:
            begin, end = (said(t, "time", units) for t in self.during)
            text += f" from {begin} to {end}"
        return text.rstrip(",").replace("degC", "°C").replace("degF", "°F")
