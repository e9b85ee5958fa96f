"""The work behind `check`: what a docket says, as plain data. Builds the section, solves nothing."""

from pathlib import Path
from typing import Any

import numpy as np

from fem.cli.answer import out, put_json
from fem.cli.check_tables import show
from fem.cli.run import asked_for, in_docket, read
from fem.docket import Docket
from fem.docket.content import content_hash
from fem.earn.limits import limit_text
from fem.earn.pose import Posed, pose
from fem.laws import Law
from fem.results.numbers import Scale, Writer
from fem.section.build import Plan
from fem.section.where import regions_at
from fem.solve.problem import Face

SMALL, LARGE = 1e-3, 20.0
"""m, across. Sections outside this are asked about, never refused; our own judgement, no source."""
COLD = 200.0
"""K. Dockets in kelvin that stay below it are asked about, never refused; our own judgement, no source."""
SAMPLES = 500
"""Instants at which a schedule is read, besides its breaks, for the lowest and highest value that is told."""

Entry = dict[str, Any]


def check_docket(path: Path, *, variant: str | None, as_json: bool) -> None:
    """Print what a docket says.

    Raises
    ------
    DocketError
        With every problem of the docket, or of its section.
    """
    docket = read(asked_for(path, variant=variant))
    with in_docket(path, docket):
        posed = pose(docket)
    found = found_in(docket, posed)
    if as_json:
        put_json(found)
    else:
        show(out(), found)


def found_in(docket: Docket, posed: Posed) -> Entry:
    """Return what was found, numbers in the docket's units.

    Keys
    ----
    title, content_hash, steady, revolution, notes, variants
    units : {length, time, temperature, difference}
    regions : list of {name, stock, area, source}
        `source` as the values of exposures, or null.
    edges : list of {name, length, faces}
        The outside; `faces` names exposures, none where it is insulated.
    interfaces : list of {between, length}
    exposures : list of {name, on, length, values}
        `on` names the edges, `length` is that of all of them.
        `values` by name: {over, lowest, highest, unit, jumps, kinks}; `over` tells what the value depends on; lowest
        and highest are null where that is more than time.
    clock : null or {begin, end, report_every, breaks}
        `breaks` counts the instants on which the march lands between begin and end.
    gauges : list of {name, x, y, region, band}
    limits : list of {name, sentence}
    wanted : {gauges}
    allowance : {cells, seconds}
    """
    writer = Writer(docket.units, steady=docket.steady, revolution=posed.problem.revolution)
    units = {name: writer.scale(name).unit for name in ("length", "time", "temperature")}
    difference = writer.scale("temperature difference")
    edges, exposures = _edges(posed, writer), _exposures(posed, writer)
    remarks = [*_odd_size(posed.plan, writer), *_adding_up(edges), *_odd_kelvin(docket, exposures)]
    return {
        "title": docket.title,
        "content_hash": content_hash(docket),
        "steady": docket.steady,
        "revolution": posed.problem.revolution,
        "notes": [*posed.plan.notes, *remarks],
        "variants": [variant.name for variant in docket.variants],
        "units": {**units, "difference": difference.unit.removeprefix("delta_")},
        "regions": _regions(posed, writer),
        "edges": edges,
        "interfaces": _interfaces(posed.plan, writer.scale("length")),
        "exposures": exposures,
        "clock": _clock(docket, posed, writer.scale("time")),
        "gauges": _gauges(docket, posed.plan, writer),
        "limits": [{"name": limit.name, "sentence": limit_text(docket, limit)} for limit in docket.limits],
        "wanted": {"gauges": difference.out(docket.wanted.gauges)},
        "allowance": {"cells": docket.allowance.cells, "seconds": docket.allowance.seconds},
    }


def _regions(posed: Posed, writer: Writer) -> list[Entry]:
    square = writer.scale("length").factor ** 2
    rows = zip(posed.plan.region_names, posed.stocks, posed.plan.region_area, posed.problem.source, strict=True)
    return [
        {
            "name": name,
            "stock": stock.stock,
            "area": float(area) / square,
            "source": None if source is None else value_of(source, "heat source", posed, writer),
        }
        for name, stock, area, source in rows
    ]


def _odd_size(plan: Plan, writer: Writer) -> list[str]:
    """Return a remark on a section so large or so small that its unit of length may be a slip."""
    if SMALL <= plan.size <= LARGE:
        return []
    return [f"the section is {writer.length(plan.size)} across: is the unit of length right?"]


def _adding_up(edges: list[Entry]) -> list[str]:
    """Return a remark on each outside edge that faces more than one exposure."""
    several = [edge for edge in edges if len(edge["faces"]) > 1]
    return [f"{edge['name']} faces {' and '.join(edge['faces'])}: what they bring adds up" for edge in several]


def _odd_kelvin(docket: Docket, exposures: list[Entry]) -> list[str]:
    """Return a remark where all temperatures of a docket in kelvin are so low that degrees Celsius may be meant."""
    starts = [docket.start.everywhere, *(region.start for region in docket.section.regions)]
    known = [float(start) for start in starts if isinstance(start, int | float)]
    known += [limit.temperature for limit in docket.limits if limit.temperature is not None]
    values = [value for exposure in exposures for value in exposure["values"].values()]
    known += [value["highest"] for value in values if value["unit"] == "K" and value["highest"] is not None]
    if docket.units.temperature != "K" or not known or max(known) >= COLD:
        return []
    return [f'no temperature here reaches {COLD:g} K (-73 °C): are they in °C? then write temperature = "degC"']


def _edges(posed: Posed, writer: Writer) -> list[Entry]:
    """Return the outside, edge by edge; a part of an edge that faces something else is an entry of its own."""
    lengths: dict[tuple[str, tuple[str, ...]], float] = {}
    for i, curve in enumerate(posed.plan.curves):
        if min(curve.left, curve.right) < 0:
            faces = tuple(face.name for face in posed.problem.faces if i in face.curves)
            key = (", ".join(writer.words(label) for label in sorted(curve.labels)), faces)
            lengths[key] = lengths.get(key, 0.0) + curve.length
    rows, scale = sorted(lengths.items()), writer.scale("length")
    return [{"name": name, "length": scale.out(length), "faces": list(faces)} for (name, faces), length in rows]


def _interfaces(plan: Plan, scale: Scale) -> list[Entry]:
    lengths: dict[tuple[int, int], float] = {}
    for curve in plan.curves:
        if min(curve.left, curve.right) >= 0:
            pair = (min(curve.left, curve.right), max(curve.left, curve.right))
            lengths[pair] = lengths.get(pair, 0.0) + curve.length
    names = plan.region_names
    rows = sorted(lengths.items())
    return [{"between": [names[a], names[b]], "length": scale.out(length)} for (a, b), length in rows]


# --- exposures --------------------------------------------------------------------------------------


def _exposures(posed: Posed, writer: Writer) -> list[Entry]:
    """Return the exposures, each once: what it says is the same on all its edges."""
    scale = writer.scale("length")
    found: dict[str, Entry] = {}
    for face in posed.problem.faces:
        if face.name not in found:
            found[face.name] = {"name": face.name, "on": [], "length": 0.0, "values": _values(face, posed, writer)}
        found[face.name]["on"].append(writer.words(face.edge))
        found[face.name]["length"] += scale.out(sum(posed.plan.curves[i].length for i in face.curves))
    return list(found.values())


def _values(face: Face, posed: Posed, writer: Writer) -> Entry:
    laws = [] if face.held is None else [("held at", face.held, "temperature")]
    laws += [("flux", flux, "heat flux") for flux in face.fluxes]
    for film in face.films:
        laws += [("film", film.coefficient, "film coefficient"), ("ambient", film.ambient, "temperature")]
    for radiant in face.radiants:
        laws += [("emissivity", radiant.emissivity, "fraction"), ("surroundings", radiant.surroundings, "temperature")]
    return {name: value_of(law, kind, posed, writer) for name, law, kind in laws}


def value_of(law: Law, kind: str, posed: Posed, writer: Writer) -> Entry:
    """Return what a value depends on, its lowest and highest over the clock, and how often it jumps and kinks there."""
    names = {"t": "time", "T": "temperature", "x": "x", "y": "y"}
    over = [name for variable, name in names.items() if variable in law.needs]
    scale = writer.scale(kind)
    begin, end = posed.problem.begin or 0.0, posed.problem.end or 0.0
    inside = [b for b in law.breaks if begin < b.t < end]
    low = high = None
    if law.needs <= {"t"}:
        values = [float(law(t=t)) for t in _instants(begin, end, [b.t for b in inside])]
        low, high = float(scale.out(min(values))), float(scale.out(max(values)))
    jumps = sum(b.jump for b in inside)
    about = {"over": over, "lowest": low, "highest": high, "unit": scale.unit.removeprefix("delta_")}
    return {**about, "jumps": jumps, "kinks": len(inside) - jumps}


def _instants(begin: float, end: float, breaks: list[float]) -> list[float]:
    """Return where to read a schedule: evenly, and at each break and right before it."""
    before = [float(np.nextafter(t, begin)) for t in breaks]
    return [*np.linspace(begin, end, SAMPLES).tolist(), *breaks, *before]


# --- clock and gauges -------------------------------------------------------------------------------


def _clock(docket: Docket, posed: Posed, scale: Scale) -> Entry | None:
    clock = docket.clock
    if clock is None:
        return None
    times = {"begin": clock.begin, "end": clock.end, "report_every": clock.report_every}
    return {**{name: scale.out(t) for name, t in times.items()}, "breaks": len(posed.problem.breaks())}


def _gauges(docket: Docket, plan: Plan, writer: Writer) -> list[Entry]:
    length, difference = writer.scale("length"), writer.scale("temperature difference")
    return [
        {
            "name": gauge.name,
            "x": length.out(gauge.x),
            "y": length.out(gauge.y),
            "region": _where(plan, gauge.x, gauge.y),
            "band": difference.out(docket.wanted.gauges if gauge.band is None else gauge.band),
        }
        for gauge in docket.gauges
    ]


def _where(plan: Plan, x: float, y: float) -> str:
    regions, on_border = regions_at(plan, x, y)
    return f"border of {' and '.join(regions)}" if on_border else regions[0]
