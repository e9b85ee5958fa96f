"""What the parts of a docket say of each other: names that must exist, be unique, and times that must be covered.

It works on whatever parts are sound, so that a docket with one bad corner still has its misspelt gauges listed.
"""

import math
from collections import Counter
from collections.abc import Iterable
from typing import Any

from pydantic_core import InitErrorDetails

from fem.docket.exposures import Exposure, Stretch
from fem.docket.limits import GAUGE_ONLY, Limit
from fem.docket.parts import LISTS, Parts
from fem.errors import Said, shown
from fem.quantities.strict import fault, nearest, unknown
from fem.schedules.models import span_of, varies
from fem.stock.models import nearest as nearest_stocks

MOST_STOCKS = 3
"""Of the library, that a message suggests."""


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
            if region.stock and region.start is None:
                hint = "state [start] everywhere, or start in the region"
                faults.append(fault(("section", "region", i, "start"), None, "a temperature at the start", hint))
    return faults


def _twice(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    for key in LISTS:
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
        if not region.stock or region.stock in parts.stocks or region.stock in parts.library:
            continue
        own = ", ".join(f'"{name}"' for name in sorted(parts.stocks))
        allowed = f"one of the {len(parts.library)} stocks of the library"
        allowed = f"own stock ({own}) or {allowed}" if own else f"{allowed}; the docket has none of its own"
        hint = f"{_stock_hint(parts, region.stock)} (heatvouch stock list shows the library's)"
        faults.append(fault(("section", "region", i, "stock"), region.stock, allowed, hint))
    return faults


def _stock_hint(parts: Parts, name: str) -> str:
    """Return what an unknown stock may have meant: own stock spelt like it, the library's with its words, or like it."""
    own = nearest(name, parts.stocks)
    meant = [own] if own else nearest_stocks(name, MOST_STOCKS)
    return f"did you mean {' or '.join(map(shown, meant))}?" if meant else "use one of these"


def _edges(parts: Parts) -> dict[str, tuple[str, ...]]:
    """Return the names of the edges of every region; where a name is doubled, of all that have it."""
    edges: dict[str, tuple[str, ...]] = {}
    for _, region in parts.regions:
        edges[region.name] = tuple(dict.fromkeys((*edges.get(region.name, ()), *region.edges())))
    return edges


def _exposures(parts: Parts) -> list[InitErrorDetails]:
    edges = _edges(parts)
    faults = []
    for i, exposure in parts.exposures:
        covered: set[str] = set()
        for j, ref in enumerate(exposure.on):
            loc = ("exposure", i, "on", j)
            if not ref:
                continue  # a faulty one, listed with its exposure
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
            elif _covered(region, edge, covered):
                faults.append(fault(loc, ref, "each edge once in an exposure", "drop the one that is covered already"))
            covered.add(ref)
    return faults


def _covered(region: str, edge: str, covered: set[str]) -> bool:
    """Return whether an edge, or one of those meant by ``region.*``, was named before in the same exposure."""
    if edge == "*":
        return any(ref.startswith(f"{region}.") for ref in covered)
    return f"{region}.{edge}" in covered or f"{region}.*" in covered


def _held_alone(parts: Parts) -> list[InitErrorDetails]:
    """Return the named edges that an exposure holds at a temperature while another one acts on them too."""
    edges = _edges(parts)
    faults: list[InitErrorDetails] = []
    owner: dict[str, Exposure] = {}
    for i, exposure in parts.exposures:
        for j, ref in enumerate(exposure.on):
            if not isinstance(ref, str):
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
        if limit.at and limit.at not in fit:  # an empty one is faulty, and listed with its limit
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
            allowed = f"at most the {parts.time(length)} that the clock runs"
            faults.append(
                fault(("limit", i, key), parts.time(value), allowed, "let the clock run longer, or shorten it")
            )
    if limit.during is not None and not parts.clock.begin <= limit.during[0] < limit.during[1] <= parts.clock.end:
        allowed = f"times within the clock, {parts.time(parts.clock.begin)} to {parts.time(parts.clock.end)}"
        faults.append(
            fault(
                ("limit", i, "during"),
                Said(" to ".join(map(parts.time, limit.during))),
                allowed,
                "let the clock run longer, or narrow it",
            )
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


def _ends(parts: Parts, first: float, last: float) -> str:
    """Return the times that a schedule covers, for a message."""
    start = f"from {parts.time(first)} on" if math.isfinite(first) else "all times"
    return f"{start} up to {parts.time(last)}" if math.isfinite(last) else start


def _schedules(parts: Parts) -> list[InitErrorDetails]:
    faults = []
    for loc, value in _scheduled(parts):
        if value is None:
            continue
        if parts.timed is False and varies(value):
            faults.append(
                fault(loc, Said("a schedule"), "values that do not vary in time in a steady docket", "write one number")
            )
        if parts.clock is None:
            continue
        first, last = span_of(value)
        begin, end = parts.clock.begin, parts.clock.end
        slack = 1e-9 * (end - begin)
        span = f"it covers {_ends(parts, first, last)}"
        if begin < first - slack:
            allowed = f"a schedule that covers the clock's begin, {parts.time(begin)}; {span}"
            faults.append(fault(loc, None, allowed, 'begin later, add earlier points, or state before = "hold"'))
        if end > last + slack:
            allowed = f"a schedule that covers the clock's end, {parts.time(end)}; {span}"
            faults.append(fault(loc, None, allowed, 'end earlier, add later points, or state after = "hold"'))
    return faults
