"""Histories as CSV: every series with its band and the band's two parts, in the docket's units."""

import csv
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fem.atomic import whole_file
from fem.results.figures import Figures
from fem.results.numbers import KIND_OF, Writer, series_text
from fem.results.record import Record

Floats = NDArray[np.float64]

DIGITS = 10
"""Significant digits of a written number: more than any band supports, so that columns can be subtracted."""


def write_histories(record: Record, path: Path) -> Path:
    """Write every series at every judged instant.

    Comment lines (``#``) name the run; then comes one header line. Columns: time; whether the docket asked to
    report at this instant (1) or it was judged only (0); then four columns a series: value, band, and the band's
    parts from space and from time. An instant at which the data jump stands twice, before and after the jump. Cells
    of the band are empty where there is none.

    Raises
    ------
    OSError
        If the file cannot be written.
    """
    writer = Writer.of(record)
    header, columns = _columns(record.figures, writer, steady=record.steady)
    with whole_file(path) as draft, draft.open("w", encoding="utf-8", newline="") as file:
        file.writelines(f"# {line}\n" for line in preamble(record))
        table = csv.writer(file, lineterminator="\n")
        table.writerow(header)
        table.writerows([_cell(x) for x in row] for row in np.column_stack(columns))
    return path


def preamble(record: Record) -> list[str]:
    """Return the lines that tell which run the numbers are of, and what they are worth."""
    lines = [
        " ".join(record.title.split()),
        f"{record.kind}, made {record.created} by heatvouch {record.versions.get('heatvouch', 'of unknown version')}",
        f"docket {record.content_hash}",
        f"outcome: {record.outcome}",
        f"standing: {record.standing}",
    ]
    lines += [f"open because: {' '.join(reason.text.split())}" for reason in record.reasons]
    if not np.isfinite(record.figures.band).any():
        lines.append("no value has a band: the band columns are empty")
    return lines


def _columns(figures: Figures, writer: Writer, *, steady: bool) -> tuple[list[str], list[Floats]]:
    header, columns = [], []
    if not steady:
        clock = writer.scale("time")
        header += [f"time [{clock.unit}]", "reported"]
        columns += [clock.out(figures.grid.t), figures.grid.reported.astype(np.float64)]
    for i, key in enumerate(figures.keys):
        scale, words = writer.scale(KIND_OF[key.kind]), series_text(key)
        step = scale.step_unit.removeprefix("delta_")
        header += [f"{words} [{scale.unit.removeprefix('delta_')}]"]
        header += [f"{words}, {part} [{step}]" for part in ("band", "band from space", "band from time")]
        bands = (figures.space[i] + figures.time[i], figures.space[i], figures.time[i])
        columns += [scale.out(figures.value[i]), *(scale.step(band) for band in bands)]
    return header, columns


def _cell(number: float) -> str:
    return f"{number:.{DIGITS}g}" if np.isfinite(number) else ""
