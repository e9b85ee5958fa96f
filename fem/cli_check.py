"""The work behind `check`: what a docket says, as plain data and as tables. Builds the section, solves nothing."""

from pathlib import Path
from typing import Any

import numpy as np
from rich.console import Console
from rich.text import Text

from fem.cli_answer import out, put_json
from fem.cli_run import asked_for, read
from fem.cli_tables import plain_table, under
from fem.docket import Docket
from fem.docket_hash import content_hash
from fem.edge import winding
from fem.laws import Law
from fem.numbers import Writer
from fem.pose import Posed, pose
from fem.problem import Face
from fem.section import Plan

ON_BORDER = 1e-9
"""A gauge nearer to a curve than this part of the section's size lies on it: rounding of the coordinates."""

Entry = dict[str, Any]


def check_docket(path: Path, *, variant: str | None, as_json: bool) -> None:
    """Print what a docket says.

    Raises
    ------
    DocketError
        With every problem of the docket, or of its section.
    """
    docket = read(asked_for(path, variant=variant))
    found = found_in(docket, pose(docket))
    if as_json:
        put_json(found)
    else:
        show(out(), found)


def found_in(docket: Docket, posed: Posed) -> Entry:
    """Return what was found, every number as text with its unit.

    Keys
    ----
    title, content_hash, steady, revolution, notes, wanted, allowance, variants
    regions : list of {name, stock, area, source}
    edges : list of {name, length, faces}
        The outside; `faces` names exposures, or says "insulated".
    interfaces : list of {between, length}
    exposures : list of {name, on, what, laws}
        `laws` tells each value: constant, or how often it jumps and kinks.
    clock : null or {begin, end, report_every, instants, landings}
    gauges : list of {name, at, region, band}
    limits : list of {name, sentence}
    """
    writer = Writer(docket.units, steady=docket.steady, revolution=posed.problem.revolution)
    return {
        "title": docket.title,
        "content_hash": content_hash(docket),
        "steady": docket.steady,
        "revolution": posed.problem.revolution,
        "notes": list(posed.plan.notes),
        "regions": _regions(posed, writer),
        "edges": _edges(posed, writer),
        "interfaces": _interfaces(posed.plan, writer),
        "exposures": [_exposure(face, posed, writer) for face in posed.problem.faces],
        "clock": _clock(docket, posed, writer),
        "gauges": _gauges(docket, posed, writer),
        "limits": [{"name": limit.name, "sentence": limit.sentence()} for limit in docket.limits],
        "wanted": f"{writer.step('temperature difference', docket.wanted.gauges)} at the gauges",
        "allowance": f"{docket.allowance.cells} cells, {docket.allowance.seconds:g} s",
        "variants": [variant.name for variant in docket.variants],
    }


def _regions(posed: Posed, writer: Writer) -> list[Entry]:
    rows = zip(posed.plan.region_names, posed.stocks, posed.plan.region_area, posed.problem.source, strict=True)
    return [
        {"name": name, "stock": stock.stock, "area": writer.area(float(area)), "source": "" if source is None else told(source, posed)}
        for name, stock, area, source in rows
    ]


def _edges(posed: Posed, writer: Writer) -> list[Entry]:
    """Return the outside, edge by edge; a part of an edge that faces something else is an entry of its own."""
    lengths: dict[tuple[str, str], float] = {}
    for i, curve in enumerate(posed.plan.curves):
        if min(curve.left, curve.right) < 0:
            faces = [face.name for face in posed.problem.faces if i in face.curves]
            key = (", ".join(sorted(curve.labels)), " and ".join(faces) or "insulated")
            lengths[key] = lengths.get(key, 0.0) + curve.length
    return [{"name": name, "length": writer.length(length), "faces": faces} for (name, faces), length in sorted(lengths.items())]


def _interfaces(plan: Plan, writer: Writer) -> list[Entry]:
    lengths: dict[tuple[int, int], float] = {}
    for curve in plan.curves:
        if min(curve.left, curve.right) >= 0:
            pair = (min(curve.left, curve.right), max(curve.left, curve.right))
            lengths[pair] = lengths.get(pair, 0.0) + curve.length
    names = plan.region_names
    return [{"between": [names[a], names[b]], "length": writer.length(length)} for (a, b), length in sorted(lengths.items())]


def _exposure(face: Face, posed: Posed, writer: Writer) -> Entry:
    length = sum(posed.plan.curves[i].length for i in face.curves)
    laws = {} if face.held is None else {"held at": face.held}
    laws |= {"flux": flux for flux in face.fluxes}
    for film in face.films:
        laws |= {"film coefficient": film.coefficient, "ambient": film.ambient}
    for radiant in face.radiants:
        laws |= {"emissivity": radiant.emissivity, "surroundings": radiant.surroundings}
    words = {name: told(law, posed) for name, law in laws.items()}
    return {"name": face.name, "on": face.edge, "length": writer.length(length), "laws": words}


def told(law: Law, posed: Posed) -> str:
    """Return in words what a law depends on, and how often it jumps and kinks within the clock."""
    if law.constant:
        return "constant"
    names = {"t": "time", "x": "x", "y": "y", "T": "temperature"}
    words = "over " + ", ".join(names[name] for name in sorted(law.needs, key="tTxy".index))
    if "t" not in law.needs or posed.problem.begin is None or posed.problem.end is None:
        return words
    inside = [b for b in law.breaks if posed.problem.begin < b.t < posed.problem.end]
    jumps = sum(b.jump for b in inside)
    return f"{words}, {jumps} jump{'s' * (jumps != 1)} and {len(inside) - jumps} kink{'s' * (len(inside) - jumps != 1)}"


def _clock(docket: Docket, posed: Posed, writer: Writer) -> Entry | None:
    clock = docket.clock
    if clock is None:
        return None
    return {
        "begin": writer.time(clock.begin),
        "end": writer.time(clock.end),
        "report_every": writer.time(clock.report_every),
        "instants": len(posed.problem.instants),
        "landings": len(posed.problem.breaks()),
    }


# --- gauges -------------------------------------------------------------------------------------------------------------------


def _gauges(docket: Docket, posed: Posed, writer: Writer) -> list[Entry]:
    rows = []
    for gauge in docket.gauges:
        band = docket.wanted.gauges if gauge.band is None else gauge.band
        there = where(posed.plan, gauge.x, gauge.y)
        wanted = writer.step("temperature difference", band)
        rows.append({"name": gauge.name, "at": writer.place(gauge.x, gauge.y), "region": there, "band": wanted})
    return rows


def where(plan: Plan, x: float, y: float) -> str:
    """Return the region in which a point lies, or the regions on whose border; "outside the section" elsewhere."""
    z = np.array([complex(x, y)])
    for curve in plan.curves:
        if curve.edge.distance(z)[0] <= ON_BORDER * plan.size:
            sides = [plan.region_names[i] for i in sorted({curve.left, curve.right}) if i >= 0]
            return f"border of {' and '.join(sides)}"
    for face in plan.faces:
        loops = [[_directed(plan, i, forward=forward) for i, forward in loop] for loop in face.loops]
        if sum(int(winding(loop, z)[0]) for loop in loops) > 0:
            return plan.region_names[face.region]
    return "outside the section"


def _directed(plan: Plan, i: int, *, forward: bool) -> Any:
    edge = plan.curves[i].edge
    return edge if forward else edge.reversed()


# --- for a terminal -----------------------------------------------------------------------------------------------------------


def show(console: Console, found: Entry) -> None:
    """Print what was found."""
    kind = "body of revolution" if found["revolution"] else "planar section"
    console.print(Text(found["title"] or "(no title)", style="bold"))
    console.print(Text(f"{kind}, docket {found['content_hash'][:12]}", style="dim"))
    for note in found["notes"]:
        console.print(Text(f"note: {note}", style="yellow"))
    _rows(console, "Regions", found["regions"], ("name", "stock", "area", "source"))
    _rows(console, "Outside edges", found["edges"], ("name", "length", "faces"))
    between = [{**entry, "between": " and ".join(entry["between"])} for entry in found["interfaces"]]
    _rows(console, "Regions that touch", between, ("between", "length"))
    laws = [{**entry, "facing": "\n".join(f"{name}: {law}" for name, law in entry["laws"].items())} for entry in found["exposures"]]
    _rows(console, "Exposures", laws, ("name", "on", "length", "facing"))
    _rows(console, "Gauges", found["gauges"], ("name", "at", "region", "band"))
    _rows(console, "Limits", found["limits"], ("name", "sentence"))
    clock = found["clock"]
    lines = ["", "steady state" if clock is None else _clock_text(clock)]
    lines += [f"wanted band: {found['wanted']}; allowance: {found['allowance']}"]
    lines += [f"variants: {', '.join(found['variants'])}"] if found["variants"] else []
    for line in [*lines, "nothing wrong was found; nothing was solved"]:
        console.print(Text(line))


def _clock_text(clock: Entry) -> str:
    extra = f" and at {clock['instants']} further instants" if clock["instants"] else ""
    landings = f"; the march lands on {clock['landings']} jumps, kinks and instants" if clock["landings"] else ""
    return f"clock: {clock['begin']} to {clock['end']}, reported every {clock['report_every']}{extra}{landings}"


def _rows(console: Console, title: str, entries: list[Entry], columns: tuple[str, ...]) -> None:
    shown = [name for name in columns if any(entry[name] for entry in entries)]
    if not entries:
        return
    table = plain_table(*shown)
    for entry in entries:
        table.add_row(*(str(entry[name]) for name in shown))
    console.print(under(title, table))
