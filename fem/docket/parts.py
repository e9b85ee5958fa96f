"""The parts of a docket whose links are checked: all of them, or what can be salvaged of a docket with faults."""

import functools
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, TypeVar, cast, get_args, get_origin

from pydantic import ConfigDict, TypeAdapter, ValidationError

from fem.docket.exposures import Exposure
from fem.docket.limits import Gauge, Limit
from fem.docket.regions import Region
from fem.docket.terms import Clock
from fem.quantities.strict import Strict
from fem.quantities.units import FileUnits, Reading, said

Part = TypeVar("Part", bound=Strict)
Listed = tuple[tuple[int, Part], ...]

LISTS = ("region", "exposure", "gauge", "limit", "variant")


@dataclass(frozen=True)
class Parts:
    """The parts of a docket, each with its place in its list, and the names of all parts, sound or not.

    In salvaged parts a faulty field is at its default; a required one is an empty text, a faulty row is left out, and a
    faulty edge is None.

    Attributes
    ----------
    regions, exposures, gauges, limits : tuple of (int, model)
    names : dict
        By list (``"region"``, ``"exposure"``, ...): the names of all its parts, in order.
    stocks : set of str
        The docket's own stock.
    library : mapping
        Stock by name.
    clock : Clock or None
    timed : bool or None
        True with a clock, False for a steady job, None while that is not known.
    start : bool
        Whether a start is stated for all regions.
    units : FileUnits
        For messages.
    """

    regions: Listed[Region]
    exposures: Listed[Exposure]
    gauges: Listed[Gauge]
    limits: Listed[Limit]
    names: dict[str, list[str]]
    stocks: frozenset[str]
    library: Mapping[str, Any]
    clock: Clock | None
    timed: bool | None
    start: bool
    units: FileUnits

    @classmethod
    def salvaged(cls, data: dict[str, Any], library: Mapping[str, Any], context: Reading) -> "Parts":
        """Return what is sound of a docket that is not."""
        lists = {key: _items(data if key != "region" else data.get("section"), key, f"{key}s") for key in LISTS}
        stock, clock, start = data.get("stock"), data.get("clock", ...), data.get("start")
        return cls(
            regions=_salvage(Region, lists["region"], context),
            exposures=_salvage(Exposure, lists["exposure"], context),
            gauges=_salvage(Gauge, lists["gauge"], context),
            limits=_salvage(Limit, lists["limit"], context),
            names={key: [_name(item) for item in items] for key, items in lists.items()},
            stocks=frozenset(stock) if isinstance(stock, dict) else frozenset(),
            library=library,
            clock=_clock(clock, context),
            timed=None if clock is ... else clock is not None,
            start=start is not None and _get(start, "everywhere") is not None,
            units=units if isinstance(units := data.get("units"), FileUnits) else context.units,
        )

    def time(self, t: float) -> str:
        """Return a time for a message."""
        return said(t, "time", self.units)

    def known(self, key: str) -> list[str]:
        """Return the names of one list, those that are there."""
        return [name for name in self.names[key] if name]


def _get(item: Any, key: str) -> Any:
    return item.get(key) if isinstance(item, dict) else getattr(item, key, None)


def _name(item: Any) -> str:
    name = _get(item, "name")
    return name if isinstance(name, str) else ""


def _items(table: Any, *keys: str) -> list[Any]:
    for key in keys:
        found = _get(table, key)
        if isinstance(found, list | tuple):
            return list(found)
        if isinstance(found, dict):  # single brackets where a list of tables belongs: a fault, told once
            return [found]
    return []


def _clock(data: Any, context: Reading) -> Clock | None:
    """Return the clock if its ends are known."""
    found = _salvage(Clock, [data], context)
    ends = [(clock.begin, clock.end) for _, clock in found]
    known = all(isinstance(t, float) for pair in ends for t in pair) and all(begin < end for begin, end in ends)
    return found[0][1] if found and known else None


def _salvage(model: type[Part], items: Iterable[Any], context: Reading) -> Listed[Part]:
    """Return the items as models, faulty ones with what is sound of them."""
    found = []
    for i, item in enumerate(items):
        try:
            found.append((i, model.model_validate(item, context=context)))
        except ValidationError as error:
            if isinstance(item, dict):  # its faults are listed with its own part
                faulty = {str(line["loc"][0]) for line in error.errors() if line["loc"]}
                found.append((i, _sound_fields(model, item, faulty, context)))
    return tuple(found)


def _sound_fields(model: type[Part], item: dict[str, Any], faulty: set[str], context: Reading) -> Part:
    try:
        table = model.from_short(item)
    except (ValidationError, ValueError, TypeError):
        table = item
    values: dict[str, Any] = {}
    for name, field in model.model_fields.items():
        key = name if name in table else field.alias
        if key in table and isinstance(table[key], list | tuple) and _element(field.annotation) is not None:
            rows = [_try(_element_adapter(model, name), element, context) for element in table[key]]
            values[name] = tuple(row for row in rows if row is not None or name == "on")
        elif key in table and key not in faulty:
            values[name] = _try(_adapter(model, name), table[key], context)
        elif field.is_required():
            values[name] = () if _element(field.annotation) is not None else ""
    return cast("Part", model.model_construct(**values))


def _element(annotation: Any) -> Any:
    """Return the annotation of the elements of a tuple of any length, None for anything else."""
    args = get_args(annotation) if get_origin(annotation) is tuple else ()
    return args[0] if len(args) == 2 and args[1] is Ellipsis else None


@functools.cache
def _adapter(model: type[Strict], name: str) -> TypeAdapter[Any]:
    field = model.model_fields[name]
    annotation: Any = field.annotation
    for mark in field.metadata:
        annotation = Annotated[annotation, mark]
    return TypeAdapter(annotation, config=ConfigDict(arbitrary_types_allowed=True))


@functools.cache
def _element_adapter(model: type[Strict], name: str) -> TypeAdapter[Any]:
    return TypeAdapter(_element(model.model_fields[name].annotation))


def _try(adapter: TypeAdapter[Any], value: Any, context: Reading) -> Any:
    try:
        return adapter.validate_python(value, context=context)
    except ValidationError:
        return None
