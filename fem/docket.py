"""The docket: all that a job is, as frozen models. Everything inside is SI and kelvin; files are `fem.docket_file`'s."""

from pathlib import Path
from typing import Any, ClassVar, Self

from pydantic import Field, PrivateAttr, ValidationError, model_validator
from pydantic_core import core_schema

from fem.docket_errors import docket_error
from fem.docket_exposures import EdgeRef, Exposure, Film, Radiant, Stretch
from fem.docket_form import changed, to_form
from fem.docket_limits import Gauge, Limit
from fem.docket_links import Parts, link_faults
from fem.docket_section import Name, Region, Section, StartLike, Vertex
from fem.errors import DocketError
from fem.log_folder import LogFolder
from fem.stock import Stock, library
from fem.strict import Strict, fault, raise_all
from fem.units import SI, FileUnits, Heat, PositiveDuration, Reading, Seconds, TemperatureDifference, Time, reading

__all__ = [
    "Allowance",
    "Clock",
    "Docket",
    "EdgeRef",
    "Exposure",
    "Film",
    "Gauge",
    "Limit",
    "Radiant",
    "Region",
    "Section",
    "Start",
    "Stretch",
    "Variant",
    "Vertex",
    "Wanted",
]

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
    def _forward(self) -> Self:
        faults = []
        if not self.begin < self.end:
            faults.append(
                fault(("end",), self.end, f"a time after the begin, {self.begin:.6g} s", "let the clock run on")
            )
        elif (self.end - self.begin) / self.report_every > MOST_REPORTS:
            hint = "report less often"
            faults.append(fault(("report_every",), self.report_every, f"at most {MOST_REPORTS} reports", hint))
        for i, t in enumerate(self.instants):
            if not self.begin <= t <= self.end:
                faults.append(
                    fault(("instants", i), t, "a time between begin and end", "drop it or let the clock run longer")
                )
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
    heat: Heat | None = Field(
        None, description="On the heat flow through each exposure: W/m planar, W for a revolution."
    )
    stored: Heat | None = Field(None, description="On the stored heat: J/m planar, J for a revolution.")


class Allowance(Strict):
    """What the work may cost."""

    cells: int = Field(
        100_000, ge=100, le=5_000_000, description="Most cells of the finest mesh.", json_schema_extra={"unit": "cells"}
    )
    seconds: Seconds = Field(
        300.0, description="Longest wall time of the work, in seconds whatever the file's unit of time."
    )


class Variant(Strict):
    """The docket with some values changed, under a name."""

    name: Name = Field(description="The variant's name.")
    changes: dict[str, Any] = Field(
        min_length=1,
        description='What is changed: path in the file\'s terms ("region.deck.stock") and value as in the file.',
    )


class Docket(Strict):
    """All that a job is.

    Made in Python every number is SI and kelvin; text with a unit, schedules, laws and callables are taken too.

    Raises
    ------
    DocketError
        With every problem of the docket.
    """

    title: str = Field("", max_length=200, description="What the job is, in one line; moves no number.")
    units: FileUnits = Field(SI, description="In which its file speaks, and the bare numbers of its variants.")
    section: Section = Field(description="The cross-section.")
    stock: dict[Name, Stock] = Field(
        default_factory=dict, description="Own stock by name; it goes before the library's."
    )
    exposures: tuple[Exposure, ...] = Field((), alias="exposure", max_length=1000, description="What the edges face.")
    clock: Clock | None = Field(description="None, in a file steady = true, for a steady job.")
    start: Start = Field(default_factory=Start, description="The state at the start.")
    gauges: tuple[Gauge, ...] = Field(
        (), alias="gauge", max_length=1000, description="Points whose history is recorded."
    )
    limits: tuple[Limit, ...] = Field((), alias="limit", max_length=1000, description="What must hold.")
    wanted: Wanted = Field(default_factory=Wanted, description="How narrow the bands shall be.")
    allowance: Allowance = Field(default_factory=Allowance, description="What the work may cost.")
    variants: tuple[Variant, ...] = Field(
        (), alias="variant", max_length=1000, description="Dockets that differ in some values."
    )
    sources: dict[str, str] = Field(
        default_factory=dict, description="Where values come from, in words; moves no number."
    )

    _logs: LogFolder = PrivateAttr(default_factory=LogFolder)

    def __init__(self, **data: Any) -> None:
        _validate(self, data, Reading(logs=LogFolder()))

    @classmethod
    def make(cls, *, folder: Path | None = None, **data: Any) -> "Docket":
        """Return a docket made in Python whose logs are in the folder, by default the current one.

        Raises
        ------
        DocketError
            With every problem of the docket.
        """
        return cls.read(data, Reading(logs=LogFolder(folder)))

    @classmethod
    def read(cls, data: dict[str, Any], context: Reading) -> "Docket":
        """Return the docket of a table in the file's form or in Python's, whose bare numbers are in the context's units.

        Raises
        ------
        DocketError
            With every problem of the docket.
        """
        docket = cls.__new__(cls)
        _validate(docket, data, context)
        return docket

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Bring the file's form into the model's: regions into the section, steady into no clock, names into stock."""
        if not isinstance(data, dict):
            return data
        data = dict(data)
        if "region" in data:
            regions, section = data.pop("region"), data.get("section", {})
            data["section"] = {**section, "region": regions} if isinstance(section, dict) else section
        if data.get("clock") == {"steady": True}:
            data["clock"] = None
        if isinstance(data.get("stock"), dict):
            data["stock"] = {name: _named(name, stock) for name, stock in data["stock"].items()}
        return data

    @model_validator(mode="after")
    def _links(self, info: core_schema.ValidationInfo) -> Self:
        context = reading(info.context)
        if context.logs is not None:
            self._logs = context.logs
        faults = link_faults(Parts.of(self, library()))
        raise_all("docket", faults)
        for i, variant in enumerate(self.variants):
            try:
                self.variant(variant.name)
            except DocketError as error:
                faults += [fault(("variant", i, p.place), p.value, p.allowed, p.hint) for p in error.problems]
        raise_all("docket", faults)
        return self

    @property
    def steady(self) -> bool:
        """True when there is no clock."""
        return self.clock is None

    def stock_of(self, region: Region) -> Stock:
        """Return the stock of a region that is not a void: the docket's own, else the library's."""
        name = region.stock or ""
        return self.stock[name] if name in self.stock else library()[name]

    def start_of(self, region: Region) -> Any:
        """Return the start temperature of a region: number in K, law or callable of x, y; None in a steady docket without."""
        return self.start.everywhere if region.start is None else region.start

    def variant(self, name: str) -> "Docket":
        """Return the docket with the changes of one of its variants.

        Raises
        ------
        DocketError
            If there is no such variant, one of its paths leads nowhere, or a value is refused.
        """
        found = [variant for variant in self.variants if variant.name == name]
        if not found:
            known = ", ".join(variant.name for variant in self.variants) or "none"
            raise DocketError.single("variant", f'"{name}"', f"the variants {known}", "use one of these")
        form = changed(to_form(self, live=True), found[0].changes)
        del form["docket"], form["variant"]
        data = {**form, "title": f"{self.title} — {name}".strip(" —"), "units": self.units}
        return Docket.read(data, Reading(units=self.units, logs=self._logs))


def _named(name: str, stock: Any) -> Any:
    if isinstance(stock, Stock):
        return stock.model_copy(update={"name": name})
    return {**stock, "name": name} if isinstance(stock, dict) else stock


def _validate(docket: Docket, data: dict[str, Any], context: Reading) -> None:
    """Fill a docket that has not been filled yet.

    Raises
    ------
    DocketError
        With every problem: of the parts, and of the links between those parts that are sound.
    """
    try:
        type(docket).__pydantic_validator__.validate_python(data, self_instance=docket, context=context)
    except ValidationError as error:
        shaped = Docket.from_short(data)
        faults = error.errors(include_url=False)
        linked = link_faults(Parts.salvaged(shaped, library(), context))
        raise docket_error(faults, linked, shaped) from None
