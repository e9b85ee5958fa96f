"""The docket: all that a job is, as frozen models. Inside all is SI and kelvin; files are `fem.docket.file`'s."""

from collections.abc import Mapping
from pathlib import Path
from typing import Any, ClassVar, Self

from pydantic import Field, PrivateAttr, ValidationError, model_validator
from pydantic_core import core_schema

from fem.docket.exposures import EdgeRef, Exposure, Film, Radiant, Stretch
from fem.docket.faults import docket_error
from fem.docket.form import Form, Writer, arranged, changed
from fem.docket.limits import Gauge, Limit
from fem.docket.links import link_faults
from fem.docket.parts import Parts
from fem.docket.regions import Name, Region, Section, Vertex
from fem.docket.terms import Allowance, Clock, Start, Variant, Wanted
from fem.errors import DocketError, Said
from fem.quantities.strict import Strict, fault, nearest, raise_all, unknown
from fem.quantities.units import SI, FileUnits, Reading, reading
from fem.schedules.log_folder import LogFolder
from fem.stock.models import Stock, library

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


LONGEST_TITLE = 200
FILE_KEYS = (
    *("docket", "section", "region", "stock", "exposure", "clock", "start", "gauge", "limit"),
    *("wanted", "allowance", "variant", "sources"),
)
"""What a file holds at its top."""


class Docket(Strict):
    """All that a job is.

    Made in Python every number is SI and kelvin; text with a unit, schedules, laws and callables are taken too.

    Raises
    ------
    DocketError
        With every problem of the docket.
    """

    HINTS: ClassVar[dict[str, str]] = {
        "clock": "add [clock] with end and report_every, or with steady = true",
        "section": "add [section] with kind, and [[region]] tables",
        "void": "write [[region]] with void = true, so that it stands in the order of the regions",
    }

    title: str = Field("", max_length=LONGEST_TITLE, description="What the job is, in one line; moves no number.")
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
        """Return the docket of a table in the file's form or in Python's; bare numbers are in the context's units.

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

    @classmethod
    def file_keys(cls) -> tuple[str, ...]:
        """Return the keys that a file may use; its reader takes [docket] apart into title and units."""
        return FILE_KEYS

    @model_validator(mode="after")
    def _links(self, info: core_schema.ValidationInfo) -> Self:
        context = reading(info.context)
        if context.logs is not None:
            self._logs = context.logs
        faults = link_faults(self._parts())
        raise_all("docket", faults)
        for i, variant in enumerate(self.variants):
            try:
                self.variant(variant.name)
            except DocketError as error:
                faults += [fault(("variant", i, p.place), Said(p.value), p.allowed, p.hint) for p in error.problems]
        raise_all("docket", faults)
        return self

    @property
    def logs(self) -> LogFolder:
        """Where its logs are found."""
        return self._logs

    @property
    def steady(self) -> bool:
        """True when there is no clock."""
        return self.clock is None

    def stock_of(self, region: Region) -> Stock:
        """Return the stock of a region that is not a void: the docket's own, else the library's."""
        name = region.stock or ""
        return self.stock[name] if name in self.stock else library()[name]

    def start_of(self, region: Region) -> Any:
        """Return a region's temperature at the start: K, or a law or callable of x, y; None in a steady docket."""
        return self.start.everywhere if region.start is None else region.start

    def _parts(self) -> Parts:
        lists: dict[str, tuple[Any, ...]] = {
            "region": self.section.regions,
            "exposure": self.exposures,
            "gauge": self.gauges,
            "limit": self.limits,
            "variant": self.variants,
        }
        return Parts(
            regions=tuple(enumerate(self.section.regions)),
            exposures=tuple(enumerate(self.exposures)),
            gauges=tuple(enumerate(self.gauges)),
            limits=tuple(enumerate(self.limits)),
            names={key: [part.name for part in parts] for key, parts in lists.items()},
            stocks=frozenset(self.stock),
            library=library(),
            clock=self.clock,
            timed=self.clock is not None,
            start=self.start.everywhere is not None,
            units=self.units,
        )

    def to_form(self, *, live: bool = False) -> Form:
        """Return the docket in the terms of its file and in its units; reading it back gives the same docket.

        Parameters
        ----------
        live : bool
            Whether laws and callables may stay as they are; a file can't hold them.

        Raises
        ------
        DocketError
            If the docket holds a callable and `live` is False.
        """
        return arranged(Writer(self.units, live=live).model(self), self.units)

    def variant(self, name: str) -> "Docket":
        """Return the docket with the changes of one of its variants.

        Raises
        ------
        DocketError
            If there is no such variant, one of its paths leads nowhere, or a value is refused.
        """
        found = [variant for variant in self.variants if variant.name == name]
        if not found:
            allowed, hint = unknown("the variants", name, (variant.name for variant in self.variants))
            raise DocketError.single("variant", f'"{name}"', allowed, hint)
        title = f"{self.title} — {name}".strip(" —")[:LONGEST_TITLE]
        return self.with_changes(found[0].changes, title=title, variants=False)

    def with_changes(self, changes: Mapping[str, Any], *, title: str | None = None, variants: bool = True) -> "Docket":
        """Return the docket with the values at some paths changed.

        Parameters
        ----------
        changes : mapping
            Path such as ``exposure.kiln.film.coefficient`` and new value, in the file's terms and units.
        title : str, optional
            Of the new docket; that of this one by default.
        variants : bool
            Whether the new docket keeps the variants of this one.

        Raises
        ------
        DocketError
            If a path leads nowhere, or a value is refused.
        """
        form = changed(self.to_form(live=True), changes)
        del form["docket"]
        if not variants:
            del form["variant"]
        data = {**form, "title": self.title if title is None else title, "units": self.units}
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
    validate = type(docket).__pydantic_validator__.validate_python
    try:
        validate(data, self_instance=docket, context=context)
    except ValidationError as error:
        faults = error.errors(include_url=False)
        meant, strangers = as_meant(data)
        if strangers:  # the rest is judged as it was meant, so that one misspelt key is one fault
            faults = [line for line in faults if line["loc"] in strangers]
            try:
                validate(meant, self_instance=docket, context=context)
            except ValidationError as others:
                faults += others.errors(include_url=False)
        shaped = Docket.from_short(meant)
        linked = link_faults(Parts.salvaged(shaped, library(), context))
        raise docket_error(faults, linked, shaped) from None


def as_meant(data: dict[str, Any]) -> tuple[dict[str, Any], list[tuple[str, ...]]]:
    """Return the docket with its unknown keys read as the nearest that is missing, and the places of these keys."""
    meant = dict(data)
    strangers = [key for key in data if key not in (*FILE_KEYS, *Docket.model_fields)]
    for key in strangers:
        value, near = meant.pop(key), nearest(key, FILE_KEYS)
        if key == "void" and isinstance(value, list) and isinstance(meant.get("region"), list):
            voids = [{**item, "void": True} for item in value if isinstance(item, dict)]
            meant["region"] = [*meant["region"], *voids]
        elif near and near not in meant:
            meant[near] = value
    return meant, [(key,) for key in strangers]
