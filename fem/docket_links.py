"""What the parts of a docket say of each other: names that must exist, be unique, and times that must be covered.

It works on whatever parts are sound, so that a docket with one bad corner still has its misspelt gauges listed.
"""

from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, TypeVar

from pydantic import ValidationError
from pydantic_core import InitErrorDetails

from fem.docket_exposures import Exposure, Stretch
from fem.docket_limits import GAUGE_ONLY, Gauge, Limit
from fem.docket_section import Region
from fem.schedules import span_of, varies
from fem.strict import Strict, fault, unknown
from fem.units import Reading

if TYPE_CHECKING:
    from fem.docket import Clock, Docket

Part = TypeVar("Part", bound=Strict)
Listed = tuple[tuple[int, Part], ...]


@dataclass(frozen=True)
class Parts:
    """The sound parts of a docket, each with its place in its list, and the names of all parts, sound or not.

    Attributes
    ----------
    regions, exposures, gauges, limits : tuple of (int, model)
    names : dict
        By list (``"region"``, ``"exposure"``, ...): the names of all its parts, in order.
    stocks : set of str
        The docket's own stock.
    library : mapping
        Stock by name.
    clock : Clock, None or missing
        The clock where it is sound; `timed` says whether there is one at all.
    timed : bool or None
        True with a clock, False for a steady job, None while that is not known.
    start : bool
        Whether a start is stated for all regions.
    """

    regions: Listed[Region]
    exposures: Listed[Exposure]
    gauges: Listed[Gauge]
    limits: Listed[Limit]
    names: dict[str, list[str]]
    stocks: frozenset[str]
    library: Mapping[str, Any]
    clock: "Clock | None"
    timed: bool | None
    start: bool

    @classmethod
    def of(cls, docket: "Docket", library: Mapping[str, Any]) -> "Parts":
        """Return the parts of a docket whose parts are all sound."""
        lists = {
            "region": docket.section.regions,
            "exposure": docket.exposures,
            "gauge": docket.gauges,
            "limit": docket.limits,
            "variant": docket.variants,
        }
        return cls(
            tuple(enumerate(docket.section.regions)),
            tuple(enumerate(docket.exposures)),
            tuple(enumerate(docket.gauges)),
            tuple(enumerate(docket.limits)),
            {key: [part.name for part in parts] for key, parts in lists.items()},  # type: ignore[attr-defined]
            frozenset(docket.stock),
            library,
            docket.clock,
            docket.clock is not None,
            docket.start.everywhere is not None,
        )

    @classmethod
    def salvaged(cls, data: dict[str, Any], library: Mapping[str, Any], context: Reading) -> "Parts":
        """Return what is sound of a docket that is not."""
        from fem.docket import Clock  # the docket is made of this file's checks; only a broken one comes back here

        section = data.get("section")
        regions = _items(section, "region", "regions")
        lists = {"region": regions} | {
            key: _items(data, key, f"{key}s") for key in ("exposure", "gauge", "limit", "variant")
        }
        stock, clock, start = data.get("stock"), data.get("clock", ...), data.get("start")
        return cls(
            _sound(Region, regions, context),
            _sound(Exposure, lists["exposure"], context),
            _sound(Gauge, lists["gauge"], context),
            _sound(Limit, lists["limit"], context),
            {key: [str(_get(item, "name") or "") for item in items] for key, items in lists.items()},
            frozenset(stock) if isinstance(stock, dict) else frozenset(),
            library,
            next((part for _, part in _sound(Clock, [clock], context)), None),
            None if clock is ... else clock is not None,
            start is not None and _get(start, "everywhere") is not None,
        )

    def known(self, key: str) -> list[str]:
        """Return the names of one list, those that are there."""
        return [name for name in self.names[key] if name]


def _get(item: Any, key: str) -> Any:
    return item.get(key) if isinstance(item, dict) else getattr(item, key, None)


def _items(table: Any, *keys: str) -> list[Any]:
    for key in keys:
        found = _get(table, key)
        if isinstance(found, list | tuple):
            return list(found)
    return []


def _sound(model: type[Part], items: Iterable[Any], context: Reading) -> Listed[Part]:
    found = []
    for i, item in enumerate(items):
        try:
            found.append((i, model.model_validate(item, context=context)))
        except ValidationError:
            continue  # its faults are listed with its own part
    return tuple(found)


def link_faults(parts: Parts) -> list[InitErrorDetails]:
    """Return every fault between the parts of a docket."""
    faults = _twice(parts)
    faults += _stocks(parts)
    faults += _exposures(parts)
    faults += _held_alone(parts)
    faults += _gauges(parts)
    faults += _limits(parts)
    faults += _schedules(parts)
    if parts.timed and not parts.start:
        for i, region in parts.regions:
            if region.stock is not None and region.start is None:
                hint = "state [start] everywhere, or start in the region"
                faults.append(fault(("section", "region", i, "start"), None, "a temperature at the start", hint))
    return faults


def _twice(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    for key in ("region", "exposure", "gauge", "limit", "variant"):
        count = Counter(parts.known(key))
        seen: set[str] = set()
        for i, name in enumerate(parts.names[key]):
            if name in seen:
                loc = ("section", key, i, "name") if key == "region" else (key, i, "name")
                faults.append(fault(loc, name, f"a name that no other {key} has", f"rename one of the {count[name]}"))
            if name:
                seen.add(name)
    shared = set(parts.known("gauge")) & set(parts.known("region"))
    for i, name in enumerate(parts.names["gauge"]):
        if name in shared:
            hint = "rename the gauge, so that a limit can tell the two apart"
            faults.append(fault(("gauge", i, "name"), name, "a name that no region has", hint))
    return faults


def _stocks(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    for i, region in parts.regions:
        if region.stock is None or region.stock in parts.stocks or region.stock in parts.library:
            continue
        _, hint = unknown("", region.stock, [*parts.stocks, *parts.library])
        own = ", ".join(sorted(parts.stocks)) or "none"
        allowed = f"own stock ({own}) or one of the {len(parts.library)} of the library"
        faults.append(
            fault(("section", "region", i, "stock"), region.stock, allowed, f"{hint} (heatvouch stock lists them)")
        )
    return faults


def _exposures(parts: Parts) -> list[InitErrorDetails]:
    edges = {region.name: region.edges() for _, region in parts.regions}
    faults = []
    for i, exposure in parts.exposures:
        covered: set[str] = set()
        for j, ref in enumerate(exposure.on):
            loc = ("exposure", i, "on", j)
            if isinstance(ref, Stretch):
                if ref.region not in parts.known("region"):
                    allowed, hint = unknown("the regions", ref.region, parts.known("region"))
                    faults.append(fault((*loc, "region"), ref.region, allowed, hint))
                continue
            region, edge = ref.split(".")
            if region not in parts.known("region"):
                allowed, hint = unknown("the regions", region, parts.known("region"))
                faults.append(fault(loc, ref, allowed, hint))
            elif region in edges and edge != "*" and edge not in edges[region]:
                allowed, hint = unknown(f'the edges of "{region}":', edge, (*edges[region], "*"))
                faults.append(fault(loc, ref, allowed, hint))
            elif (
                ref in covered
                or f"{region}.*" in covered
                or (edge == "*" and any(c.startswith(f"{region}.") for c in covered))
            ):
                faults.append(fault(loc, ref, "each edge once in an exposure", "drop the one that is covered already"))
            covered.add(ref)
    return faults


def _held_alone(parts: Parts) -> list[InitErrorDetails]:
    """Return the named edges that an exposure holds at a temperature while another one acts on them too."""
    edges = {region.name: region.edges() for _, region in parts.regions}
    faults, owner = [], {}
    for i, exposure in parts.exposures:
        for j, ref in enumerate(exposure.on):
            if isinstance(ref, Stretch):
                continue  # stretches overlap as the section is cut up: that is found out there
            region, edge = ref.split(".")
            names = (f"{region}.{name}" for name in edges.get(region, ())) if edge == "*" else (ref,)
            for name in names:
                first = owner.setdefault(name, exposure)
                if first is not exposure and (first.held is not None or exposure.held is not None):
                    hint = "drop one of the two: a held temperature stands alone"
                    allowed = f'no other exposure where one is held; "{first.name}" acts on {name} too'
                    faults.append(fault(("exposure", i, "on", j), ref, allowed, hint))
    return faults


def _gauges(parts: Parts) -> list[InitErrorDetails]:
    solid = [region.name for _, region in parts.regions if region.stock is not None]
    faults = []
    for i, gauge in parts.gauges:
        if gauge.region is None:
            continue
        if gauge.region not in parts.known("region") or (
            gauge.region not in solid and any(region.name == gauge.region for _, region in parts.regions)
        ):
            allowed, hint = unknown("the regions of stock", gauge.region, solid)
            faults.append(fault(("gauge", i, "region"), gauge.region, allowed, hint))
    return faults


def _limits(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    gauges, voids = parts.known("gauge"), [region.name for _, region in parts.regions if region.stock is None]
    places = [*gauges, *(name for name in parts.known("region") if name not in voids), "anywhere"]
    for i, limit in parts.limits:
        fit = gauges if limit.must in GAUGE_ONLY else places
        if limit.at not in fit:
            what = "the gauges" if limit.must in GAUGE_ONLY else "the gauges and regions"
            allowed, hint = unknown(what, limit.at, fit)
            faults.append(fault(("limit", i, "at"), limit.at, allowed, hint))
        if limit.other is not None and limit.other not in gauges:
            allowed, hint = unknown("the gauges", limit.other, gauges)
            faults.append(fault(("limit", i, "other"), limit.other, allowed, hint))
        faults += _limit_times(parts, i, limit)
    return faults


def _limit_times(parts: Parts, i: int, limit: Limit) -> list[InitErrorDetails]:
    faults = []
    timed = [key for key in ("within", "at_least", "rate", "over", "during") if getattr(limit, key) is not None]
    if parts.timed is False and timed:
        faults.append(
            fault(
                ("limit", i, timed[0]), timed[0], "limits without times in a steady docket", "drop it, or state a clock"
            )
        )
    if parts.clock is None:
        return faults
    length = parts.clock.end - parts.clock.begin
    for key in ("within", "at_least", "over"):
        value = getattr(limit, key)
        if value is not None and value > length:
            allowed = f"at most the {length:.6g} s that the clock runs"
            faults.append(fault(("limit", i, key), value, allowed, "let the clock run longer, or shorten it"))
    if limit.during is not None and not parts.clock.begin <= limit.during[0] < limit.during[1] <= parts.clock.end:
        allowed = f"times within the clock, {parts.clock.begin:.6g} s to {parts.clock.end:.6g} s"
        faults.append(
            fault(("limit", i, "during"), list(limit.during), allowed, "let the clock run longer, or narrow it")
        )
    return faults


def _scheduled(parts: Parts) -> Iterable[tuple[tuple[int | str, ...], Any]]:
    """Yield every value that may vary in time, with its place."""
    for i, region in parts.regions:
        yield ("section", "region", i, "source"), region.source
    for i, exposure in parts.exposures:
        yield ("exposure", i, "held"), exposure.held
        yield ("exposure", i, "flux"), exposure.flux
        if exposure.film is not None:
            yield ("exposure", i, "film", "coefficient"), exposure.film.coefficient
            yield ("exposure", i, "film", "ambient"), exposure.film.ambient
        if exposure.radiant is not None:
            yield ("exposure", i, "radiant", "emissivity"), exposure.radiant.emissivity
            yield ("exposure", i, "radiant", "surroundings"), exposure.radiant.surroundings


def _schedules(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    for loc, value in _scheduled(parts):
        if value is None:
            continue
        if parts.timed is False and varies(value):
            faults.append(
                fault(loc, "a schedule", "values that do not vary in time in a steady docket", "write one number")
            )
        if parts.clock is None:
            continue
        first, last = span_of(value)
        begin, end = parts.clock.begin, parts.clock.end
        slack = 1e-9 * (end - begin)
        span = f"it says something from {first:.9g} s to {last:.9g} s"
        if begin < first - slack:
            allowed = f"a schedule that covers the clock's begin, {begin:.9g} s; {span}"
            faults.append(fault(loc, None, allowed, 'begin later, add earlier points, or state before = "hold"'))
        if end > last + slack:
            allowed = f"a schedule that covers the clock's end, {end:.9g} s; {span}"
            faults.append(fault(loc, None, allowed, 'end earlier, add later points, or state after = "hold"'))
    return faults
