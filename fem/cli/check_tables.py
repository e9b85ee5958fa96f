"""What `check` found, as tables for a terminal."""

from typing import Any

from rich.console import Console
from rich.text import Text

from fem.cli.tables import plain_table, under
from fem.results.numbers import sign
from fem.results.rounding import plain

Entry = dict[str, Any]


def show(console: Console, found: Entry) -> None:
    """Print what was found; the keys are those of `fem.cli.check.found_in`."""
    kind = "body of revolution" if found["revolution"] else "planar section"
    console.print(Text(found["title"] or "(no title)", style="bold"))
    console.print(Text(f"{kind}, docket {found['content_hash'][:12]}", style="dim"))
    for note in found["notes"]:
        console.print(Text(f"note: {note}", style="yellow"))
    for title, columns, rows in _tables(found):
        if rows:
            table = plain_table(*columns)
            for row in rows:
                table.add_row(*row)
            console.print(under(title, table))
    for line in ("", *_lines(found)):
        console.print(Text(line))


def _tables(found: Entry) -> list[tuple[str, tuple[str, ...], list[list[str]]]]:
    length, step = found["units"]["length"], sign(found["units"]["difference"])
    regions = [
        [r["name"], r["stock"], f"{plain(r['area'])} {length}²", "" if r["source"] is None else value_text(r["source"])]
        for r in found["regions"]
    ]
    edges = [
        [e["name"], f"{plain(e['length'])} {length}", " and ".join(e["faces"]) or "insulated"] for e in found["edges"]
    ]
    touching = [[" and ".join(i["between"]), f"{plain(i['length'])} {length}"] for i in found["interfaces"]]
    exposures = [
        [e["name"], "\n".join(e["on"]), f"{plain(e['length'])} {length}", _values_text(e["values"])]
        for e in found["exposures"]
    ]
    gauges = [
        [g["name"], f"({plain(g['x'])}, {plain(g['y'])}) {length}", g["region"], f"{plain(g['band'])} {step}"]
        for g in found["gauges"]
    ]
    return [
        ("Regions", ("region", "stock", "area", "source"), regions),
        ("Outside edges", ("edge", "length", "faces"), edges),
        ("Regions that touch", ("between", "length"), touching),
        ("Exposures", ("exposure", "on", "length", "value"), exposures),
        ("Gauges", ("gauge", "at", "in", "wanted band"), gauges),
        ("Limits", ("limit", "says"), [[limit["name"], limit["sentence"]] for limit in found["limits"]]),
    ]


def _values_text(values: dict[str, Entry]) -> str:
    return "\n".join(f"{name} {value_text(value)}" for name, value in values.items())


def value_text(value: Entry) -> str:
    """Return a value in words: its constant, or its lowest and highest and how often it breaks.

    Examples
    --------
    >>> value_text({"over": [], "lowest": 25.0, "highest": 25.0, "unit": "W/(m^2 K)", "jumps": 0, "kinks": 0})
    '25 W/(m² K)'
    >>> value_text({"over": ["time"], "lowest": 20.0, "highest": 800.0, "unit": "degC", "jumps": 1, "kinks": 2})
    '20 to 800 °C over time, 1 jump, 2 kinks'
    """
    unit = sign(value["unit"]).replace("^2", "²").replace("^3", "³")
    if not value["over"]:
        return f"{plain(value['lowest'])} {unit}".rstrip()
    over = f"over {' and '.join(value['over'])}"
    extent = f"{plain(value['lowest'])} to {plain(value['highest'])} {unit} " if value["lowest"] is not None else ""
    counts = [
        f"{n} {word}{'s' if n > 1 else ''}" for word, n in (("jump", value["jumps"]), ("kink", value["kinks"])) if n
    ]
    return ", ".join((extent + over, *counts))


def _lines(found: Entry) -> list[str]:
    clock, time, step = found["clock"], found["units"]["time"], sign(found["units"]["difference"])
    lines = ["steady state"]
    if clock is not None:
        breaks = f"{clock['breaks']} break{'' if clock['breaks'] == 1 else 's'}"
        ends = f"clock: {plain(clock['begin'])} to {plain(clock['end'])} {time}"
        lines = [f"{ends}, reported every {plain(clock['report_every'])} {time}, {breaks} to land on"]
    allowance = found["allowance"]
    wanted = f"wanted band: {plain(found['wanted']['gauges'])} {step} at the gauges that state none of their own"
    lines.append(f"{wanted}; allowance: {allowance['cells']} cells, {plain(allowance['seconds'])} s")
    if found["variants"]:
        lines.append(f"variants: {', '.join(found['variants'])}")
    return [*lines, "nothing wrong was found; nothing was solved"]
