"""A record as tables for a terminal: every number with its band, or with the words that it has none. Never solves."""

import math
from collections.abc import Iterable

import numpy as np
from rich import box
from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from fem.results.cautions import RESPONSIBILITY, cautions
from fem.results.history import Key
from fem.results.numbers import START, Writer, peak_text
from fem.results.record import Record
from fem.results.verdicts import Call, Verdict

COLOURS = {Call.met: "green", Call.not_met: "red", Call.too_close: "yellow"}
NO_VERDICT = "no verdict: no band"
MANY = 100.0
"""Margins of more bands than this are just called that: what matters is settled."""


def show_record(console: Console, record: Record) -> None:
    """Print all that a user must see of a record."""
    console.print(Group(*_parts(record)))


def _parts(record: Record) -> list[RenderableType]:
    writer = Writer.of(record)
    tables = (gauges, regions, limits, ledger, findings)
    parts = [_head(record), *(table(record, writer) for table in tables), standing(record, writer)]
    return [part for part in parts if part is not None]


def _head(record: Record) -> RenderableType:
    title = Text(record.title or "(no title)", style="bold")
    size = f"{'finest mesh ' if record.kind == 'vouch' else ''}{len(record.mesh.cells)} cells"
    steady = ", steady state" if record.steady else ""
    made = f"{record.kind} of docket {record.content_hash[:12]}{steady}, {size}, {record.seconds:.1f} s of work"
    lines = [title, Text(made, style="dim")]
    if record.kind == "quick look":
        lines.append(Text("no band (quick look): one run on one mesh, no number here is vouched for", style="yellow"))
    elif not np.isfinite(record.figures.band).any():
        lines.append(Text("no band: the work ended before there were runs to compare", style="yellow"))
    if record.outcome != "finished":
        lines.append(Text(f"outcome: {record.outcome}", style="red"))
    return Group(*lines)


def plain_table(*columns: str, wrapped: tuple[str, ...] = ()) -> Table:
    """Return an empty table in the style of all tables here; only the `wrapped` columns may take several lines."""
    table = Table(box=box.SIMPLE_HEAD, show_edge=False, padding=(0, 1))
    for name in columns:
        table.add_column(name, overflow="fold", no_wrap=bool(wrapped) and name not in wrapped)
    return table


def under(title: str, table: Table) -> RenderableType:
    """Return a table under its title, set off from what stands above."""
    return Group("", Text(title, style="bold"), Padding(table, (0, 0, 0, 1)))


# --- temperatures ---------------------------------------------------------------------------------


def gauges(record: Record, writer: Writer) -> RenderableType | None:
    """Return the table of gauges: highest and lowest with their instants, and the last value."""
    keys = [key for key in record.figures.keys if key.kind == "gauge"]
    if not keys:
        return None
    if record.steady:
        return _steady_table("Gauges", record, writer, keys)
    table = plain_table("gauge", "highest", "lowest", _last_column(record), wrapped=("gauge",))
    for key in keys:
        high, low = (_extreme(record, writer, key, lowest=lowest) for lowest in (False, True))
        table.add_row(key.name, high, low, _end(record, writer, key))
    return under("Gauges", table)


def regions(record: Record, writer: Writer) -> RenderableType | None:
    """Return the table of regions: the hottest and the coldest that any point of each gets."""
    names = list(dict.fromkeys(key.name for key in record.figures.keys if key.kind in ("highest", "lowest")))
    if not names:
        return None
    if record.steady:
        wanted = [key for key in record.figures.keys if key.kind in ("highest", "lowest", "mean")]
        return _steady_table("Regions", record, writer, wanted)
    table = plain_table("region", "hottest point", "coldest point", wrapped=("region",))
    for name in names:
        keys = [Key(kind, name) for kind in ("highest", "lowest")]
        known = [key in record.figures.keys for key in keys]
        cells = [
            _extreme(record, writer, key, lowest=key.kind == "lowest") if there else ""
            for key, there in zip(keys, known, strict=True)
        ]
        table.add_row(name or "whole section", *cells)
    return under("Regions", table)


def _last_column(record: Record) -> str:
    return "at the end" if record.outcome == "finished" else "where it stopped"


def _extreme(record: Record, writer: Writer, key: Key, *, lowest: bool) -> Text:
    value, when = peak_text(writer, record.figures, key, lowest=lowest)
    place = ""
    if key.kind in ("highest", "lowest") and not when.startswith(START):  # at the start, all of a region is alike
        place = f"\n{writer.place(*record.spot(key.name, lowest=lowest))}"
    return Text.assemble(value, (f"\nat {when}{place}", "dim"))


def _steady_table(title: str, record: Record, writer: Writer, keys: Iterable[Key]) -> RenderableType:
    table = plain_table(title.lower().removesuffix("s"), "", "temperature")
    for key in keys:
        table.add_row(key.name or "whole section", "" if key.kind == "gauge" else key.kind, _end(record, writer, key))
    return under(title, table)


def _end(record: Record, writer: Writer, key: Key) -> str:
    value, band = record.figures.series(key)
    return writer.value("temperature", float(value[-1]), float(band[-1]))


# --- limits ---------------------------------------------------------------------------------------


def limits(record: Record, writer: Writer) -> RenderableType | None:
    """Return the table of limits: verdict, margin in kelvin and in bands, and when."""
    if not record.verdicts:
        return None
    table = plain_table("limit", "verdict", "margin", wrapped=("limit",))
    for verdict in record.verdicts:
        name = Text(verdict.limit)
        when = _when(record, writer, verdict)
        name.append(f"\n{verdict.text}" + (f"\n{when}" if when else ""), style="dim")
        margin = Text(writer.margin(verdict.margin, verdict.band, is_rate=verdict.is_rate))
        margin.append(f"\n{bands_text(verdict)}", style="dim")
        table.add_row(name, call_text(verdict), margin)
    return under("Limits", table)


def call_text(verdict: Verdict) -> Text:
    """Return the verdict in words and colour; without a band there is none."""
    if not math.isfinite(verdict.band):
        return Text(NO_VERDICT, style="yellow")
    return Text(verdict.call.value, style=COLOURS[verdict.call])


def bands_text(verdict: Verdict) -> str:
    """Return the margin in bands, in words; nothing where there is no band."""
    if not math.isfinite(verdict.band):
        return ""
    size = abs(verdict.bands)
    return f"{size:.2g} bands" if size < MANY else f"over {MANY:.0f} bands"


def _when(record: Record, writer: Writer, verdict: Verdict) -> str:
    if record.steady:
        return ""
    clock = (float(record.figures.grid.t[0]), float(record.figures.grid.t[-1]))
    if verdict.crossing is None:
        return f"tightest at {writer.instant(verdict.t, clock)}" if math.isfinite(verdict.margin) else ""
    if not math.isfinite(verdict.band):
        reached = verdict.crossing[0]
        return f"reached at {writer.instant(reached, clock)}" if math.isfinite(reached) else "not reached"
    text = writer.crossing(*verdict.crossing)
    return text if text.startswith("not") else f"reached at {text}"


# --- heat -----------------------------------------------------------------------------------------


def ledger(record: Record, writer: Writer) -> RenderableType:
    """Return the heat ledger: in through each exposure and each of its edges, made, stored, unexplained.

    What has a band carries it; what has none is the exact account of the finest run.
    """
    book, kind = record.ledger, "flow" if record.steady else "heat"
    table = plain_table("heat", "amount")
    for name in dict.fromkeys(key.name for key in record.figures.keys if key.kind == kind):
        edges = [(edge, heat) for edge, heat in book.through if edge.startswith(f"{name} on ")]
        if len(edges) > 1:
            table.add_row(f"in through {name}, all its edges", _amount(record, writer, Key(kind, name), None))
        for edge, heat in edges:
            told = writer.words(edge)
            words = f"  of it{told.removeprefix(name)}" if len(edges) > 1 else f"in through {told}"
            whole = Key(kind, name if len(edges) == 1 else edge)
            table.add_row(words, _amount(record, writer, whole, heat))
    for name, heat in book.made:
        table.add_row(f"made in {name}", _amount(record, writer, Key("made", name), heat))
    table.add_row("stored", _amount(record, writer, Key("stored", ""), book.stored))
    part = f"{100.0 * book.part:.2g} % of the {writer.heat(book.turned_over)} turned over"
    table.add_row("unexplained", f"{writer.heat(book.unexplained)}, {part}")
    return under("Heat ledger of the finest run", table)


def _amount(record: Record, writer: Writer, key: Key, exact: float | None) -> str:
    """Return the last value of a series with its band; the exact account where there is no such series."""
    if key in record.figures.keys:
        value, band = record.figures.series(key)
        return writer.value("heat", float(value[-1]), float(band[-1]))
    return "" if exact is None else writer.heat(exact)


# --- findings and standing ------------------------------------------------------------------------


def findings(record: Record, writer: Writer) -> RenderableType | None:
    """Return what the checks found; those that keep the standing open first."""
    if not record.findings:
        return None
    table = plain_table("check", "", "what was found", wrapped=("what was found",))
    for finding in sorted(record.findings, key=lambda found: not found.blocks):
        told = Text(writer.words(finding.message))
        if (
            finding.x is not None
            and finding.y is not None
            and writer.place(finding.x, finding.y) not in finding.message
        ):
            told.append(f" — at {writer.place(finding.x, finding.y)}")
        if finding.close:
            told.append(f"\nto close it: {writer.words(finding.close)}", style="dim")
        weight = Text("keeps it open", style="red") if finding.blocks else Text("remark", style="dim")
        table.add_row(finding.check, weight, told)
    return under("Findings", table)


def standing(record: Record, writer: Writer) -> RenderableType:
    """Return the standing with its reasons and what would close each."""
    style = "bold green" if record.standing == "vouched" else "bold yellow"
    lines: list[RenderableType] = ["", Text.assemble(("Standing: ", "bold"), (record.standing, style))]
    for number, reason in enumerate(record.reasons, start=1):
        told = Text(writer.words(f"{number}. {reason.text}"))
        if reason.close:
            told.append(f"\n   to close it: {writer.words(reason.close)}", style="dim")
        lines.append(Padding(told, (0, 0, 0, 2)))
    return Group(*lines)


def show_end(console: Console, record: Record, where: str) -> None:
    """Print where the record lies, who answers for its use, and the cautions that the job calls for."""
    console.print(Text(f"\nRecord: {where}"), soft_wrap=True)
    console.print(Text(RESPONSIBILITY))
    for caution in cautions(record):
        console.print(Text(caution, style="yellow"))
