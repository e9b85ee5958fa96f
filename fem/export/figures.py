"""A record's figures as JSON: every number with its band and unit, in the docket's units."""

import math
from pathlib import Path
from typing import Any

from fem.atomic import whole_file
from fem.results.cautions import RESPONSIBILITY, cautions
from fem.results.figures import Peak
from fem.results.history import Key
from fem.results.numbers import KIND_OF, Writer, series_text
from fem.results.plain_json import as_json, json_safe
from fem.results.record import Record
from fem.results.verdicts import Verdict

FORMAT = 1
"""Raised when a key changes its meaning or goes."""

Entry = dict[str, Any]


def figures_of(record: Record) -> Entry:
    """Return the figures as plain data that strict JSON can hold.

    Keys
    ----
    format, kind, title, content_hash, created, versions, outcome, standing, seconds
        As in the record; `format` is that of this layout.
    reasons : list of {text, close}
        Why the standing is open.
    units : {length, time, temperature, difference, heat, flow}
        Of every number below that states no unit of its own.
    series : list of {kind, name, text, unit, band_unit, highest, lowest, end}
        `highest` and `lowest` are {value, band, time, earliest, latest}, `end` is {value, band}. A band of null
        means that there is none; a time of null that it does not lie within the clock. A steady state has `end`
        only.
    limits : list of {name, sentence, verdict, margin, band, unit, bands, time, crossing}
        `verdict` is null without a band; `bands` is the margin over its band; `crossing` is null or {time,
        earliest, latest}.
    ledger : {through, made, stored, unexplained, turned_over, unexplained_part}
        Heat by name; the part is a plain fraction.
    findings : list of {check, blocks, message, close, x, y}
    turns : list of {found, then, cells, steps, seconds}
    work : the numbers of the work; lengths in m, times in s
    cautions : list of str
    """
    writer = Writer.of(record)
    return {
        "format": FORMAT,
        **{
            name: getattr(record, name)
            for name in ("kind", "title", "content_hash", "created", "versions", "outcome", "standing")
        },
        "seconds": round(record.seconds, 3),
        "reasons": [{"text": reason.text, "close": reason.close} for reason in record.reasons],
        "units": _units(writer),
        "series": [_series(record, writer, key) for key in record.figures.keys],
        "limits": [_limit(record, writer, verdict) for verdict in record.verdicts],
        "ledger": _ledger(record),
        "findings": [_finding(record, writer, i) for i in range(len(record.findings))],
        "turns": [{**vars(turn), "seconds": round(turn.seconds, 3)} for turn in record.turns],
        "work": json_safe(record.facts),
        "cautions": [*cautions(record), RESPONSIBILITY],
    }


def write_figures(record: Record, path: Path) -> Path:
    """Write `figures_of` a record as a JSON file.

    Raises
    ------
    OSError
        If the file cannot be written.
    """
    with whole_file(path) as draft:
        draft.write_text(as_json(figures_of(record)) + "\n", encoding="utf-8")
    return path


def _units(writer: Writer) -> Entry:
    units = {name: writer.scale(name).unit for name in ("length", "time", "temperature", "heat", "flow")}
    return {**units, "difference": writer.scale("temperature difference").unit.removeprefix("delta_")}


def _series(record: Record, writer: Writer, key: Key) -> Entry:
    scale, figures = writer.scale(KIND_OF[key.kind]), record.figures
    step = scale.step_unit.removeprefix("delta_")
    about = {
        "kind": key.kind,
        "name": key.name,
        "text": series_text(key),
        "unit": scale.unit.removeprefix("delta_"),
        "band_unit": step,
    }
    value, band = figures.series(key)
    end = {"value": float(scale.out(value[-1])), "band": float(scale.step(band[-1]))}
    if record.steady:
        return {**about, "end": end}
    extremes = {"highest": figures.peak(key), "lowest": figures.peak(key, lowest=True)}
    return {**about, **{name: _peak(writer, key, peak) for name, peak in extremes.items()}, "end": end}


def _peak(writer: Writer, key: Key, peak: Peak) -> Entry:
    scale, clock = writer.scale(KIND_OF[key.kind]), writer.scale("time")
    known = math.isfinite(peak.band)
    return {
        "value": float(scale.out(peak.value)),
        "band": float(scale.step(peak.band)),
        "time": float(clock.out(peak.t)),
        "earliest": float(clock.out(peak.t_low)) if known else None,
        "latest": float(clock.out(peak.t_high)) if known else None,
    }


def _limit(record: Record, writer: Writer, verdict: Verdict) -> Entry:
    scale, clock = writer.scale("heating rate" if verdict.is_rate else "temperature difference"), writer.scale("time")
    banded = math.isfinite(verdict.band)
    crossing: Entry | None = None
    if verdict.crossing is not None:
        crossing = {
            n: float(clock.out(t)) for n, t in zip(("time", "earliest", "latest"), verdict.crossing, strict=True)
        }
        if not banded:
            crossing |= {"earliest": None, "latest": None}
    return {
        "name": verdict.limit,
        "sentence": verdict.text,
        "verdict": verdict.call.value if banded else None,
        "margin": float(scale.out(verdict.margin)),
        "band": float(scale.out(verdict.band)),
        "unit": scale.unit.replace("delta_", ""),
        "bands": float(verdict.bands) if banded else None,
        "time": None if record.steady else float(clock.out(verdict.t)),
        "crossing": crossing,
    }


def _ledger(record: Record) -> Entry:
    ledger = record.ledger
    return {
        "through": [{"name": name, "heat": heat} for name, heat in ledger.through],
        "made": [{"name": name, "heat": heat} for name, heat in ledger.made],
        "stored": ledger.stored,
        "unexplained": ledger.unexplained,
        "turned_over": ledger.turned_over,
        "unexplained_part": ledger.part,
    }


def _finding(record: Record, writer: Writer, i: int) -> Entry:
    finding, length = record.findings[i], writer.scale("length")
    x, y = (None if z is None else float(length.out(z)) for z in (finding.x, finding.y))
    return {
        "check": finding.check,
        "blocks": finding.blocks,
        "message": finding.message,
        "close": finding.close,
        "x": x,
        "y": y,
    }
