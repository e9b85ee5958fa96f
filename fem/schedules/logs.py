"""Logged CSV files: read strictly, every fault with its line number, and never more than a bounded size.

The format is RFC 4180 with the liberties that loggers take: ``;`` or a tab instead of the comma, a decimal comma where
cells are parted by ``;``, comment lines that begin with ``#``, and ISO 8601 time stamps.
"""

import csv
import math
from dataclasses import dataclass, field
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from fem.errors import DocketError, Problem, shown
from fem.quantities.strict import unknown
from fem.quantities.units import to_si

Floats = NDArray[np.float64]

MAX_ROWS = 1_000_000
MAX_FAULTS = 20
"""Faults listed per log; a file of the wrong kind would otherwise list one per line."""


@dataclass(frozen=True, eq=False)
class Samples:
    """What a log holds: one column against time, as it stands in the file.

    Attributes
    ----------
    t : (n,) array
        s since the file's zero; since the first row where the file has time stamps.
    v : (n,) array
        In the file's unit.
    """

    t: Floats
    v: Floats

    def __eq__(self, other: object) -> bool:
        """Return whether the same numbers stand in both."""
        return isinstance(other, Samples) and np.array_equal(self.t, other.t) and np.array_equal(self.v, other.v)

    def __hash__(self) -> int:
        """Return a hash that agrees with equality."""
        return hash((self.t.tobytes(), self.v.tobytes()))


@dataclass(frozen=True)
class Sheet:
    """The cells of a CSV file.

    Attributes
    ----------
    name : str
        The file's name, for messages.
    header : tuple of str
    rows : list of list of str
    lines : list of int
        The line of the file on which each row ends.
    decimal_comma : bool
        Whether cells are parted by ``;``, so that a comma is a decimal mark.
    """

    name: str
    header: tuple[str, ...]
    rows: list[list[str]]
    lines: list[int]
    decimal_comma: bool


@dataclass(frozen=True)
class Wanted:
    """Which part of a log is read, and how strictly.

    Attributes
    ----------
    time, column : str
        Names in the header.
    time_unit : str
        Of a time column that holds numbers.
    jumps : bool
        Whether a time given twice is a jump rather than a fault.
    max_gap : float or None
        s, the longest time between two rows.
    """

    time: str
    column: str
    time_unit: str
    jumps: bool = False
    max_gap: float | None = None


def read_sheet(content: bytes, name: str) -> Sheet:
    """Return the cells of a CSV file.

    Raises
    ------
    DocketError
        If it is no text, has no header, only one column or too many rows.
    """

    def refuse(value: str, allowed: str, hint: str) -> DocketError:
        return DocketError.single(name, value, allowed, hint)

    if b"\0" in content:
        raise refuse(
            "a file with zero bytes", "a CSV file in UTF-8 or Windows-1252", "export the log as plain CSV, in UTF-8"
        )
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = content.decode("cp1252", errors="replace")
    lines = text.splitlines()
    kept = [(i, line) for i, line in enumerate(lines, 1) if line.strip() and not line.lstrip().startswith("#")]
    if len(kept) > MAX_ROWS:
        raise refuse(
            f"{len(kept)} rows", f"at most {MAX_ROWS} rows", "thin the log or cut it into the part that matters"
        )
    if not kept:
        raise refuse("nothing", "a header line and rows", "check that it is the right file")
    delimiter = next((mark for mark in ";\t," if mark in kept[0][1]), None)
    if delimiter is None:
        raise refuse(
            shown(kept[0][1]), "a header line with cells parted by , or ; or a tab", "add the names of the columns"
        )
    try:
        cells = list(csv.reader((line for _, line in kept), delimiter=delimiter, strict=True))
    except csv.Error as error:
        raise refuse(str(error), "cells as in RFC 4180", "mend the quotes of the file") from error
    if len(cells) != len(kept):
        raise refuse("a quoted line break", "one row a line", "take the line breaks out of the cells")
    header = tuple(cell.strip() for cell in cells[0])
    return Sheet(name, header, cells[1:], [i for i, _ in kept[1:]], delimiter == ";")


@dataclass
class _Faults:
    """Collects the faults of one log, up to `MAX_FAULTS`."""

    name: str
    found: list[Problem] = field(default_factory=list)

    def add(self, place: str, value: str, allowed: str, hint: str) -> None:
        """Note a fault."""
        if len(self.found) < MAX_FAULTS:
            self.found.append(Problem(f"{self.name}, {place}", value, allowed, hint))

    def raise_if_any(self) -> None:
        """Raise what was found."""
        if self.found:
            raise DocketError(self.found)


def read_samples(sheet: Sheet, wanted: Wanted) -> Samples:
    """Return one column of a sheet against time.

    Raises
    ------
    DocketError
        With every fault: unknown columns, gaps, what is no number, times that go back or stand still.
    """
    faults = _Faults(sheet.name)
    columns = [_column(sheet, name, faults) for name in (wanted.time, wanted.column)]
    faults.raise_if_any()
    if len(sheet.rows) < 2:
        faults.add("rows", f"{len(sheet.rows)}", "two rows or more below the header", "check that it is the right file")
    cells = [_cells(sheet, i, faults) for i in columns]
    t = _times(sheet, cells[0], wanted, faults)
    v = np.array(_numbers(sheet, cells[1], wanted.column, faults))
    faults.raise_if_any()
    _check_order(sheet, t, wanted, faults)
    faults.raise_if_any()
    return Samples(t, v)


def _column(sheet: Sheet, name: str, faults: _Faults) -> int:
    found = [i for i, label in enumerate(sheet.header) if label == name]
    if not found:
        allowed, hint = unknown("the columns", name, sheet.header)
        faults.add("header", shown(name), allowed, hint)
    elif len(found) > 1:
        faults.add("header", shown(name), "a name that one column has", "rename one of the two columns")
    return found[0] if found else -1


def _cells(sheet: Sheet, column: int, faults: _Faults) -> list[str]:
    cells = []
    for row, line in zip(sheet.rows, sheet.lines, strict=True):
        cell = row[column].strip() if column < len(row) else ""
        if not cell:
            label = sheet.header[column]
            allowed = f'a value in every row of column "{label}"'
            faults.add(
                f"line {line}",
                "a gap",
                allowed,
                "fill the cell, or delete the line: the value is then linear across it",
            )
        cells.append(cell)
    return cells


def _number(cell: str, *, decimal_comma: bool) -> float:
    if decimal_comma and cell.count(",") == 1 and "." not in cell:
        cell = cell.replace(",", ".")
    number = float(cell) if "_" not in cell else math.nan
    if not math.isfinite(number):
        raise ValueError("not finite")
    return number


def _numbers(sheet: Sheet, cells: list[str], label: str, faults: _Faults) -> list[float]:
    numbers = []
    allowed = 'a number with a decimal point (or a decimal comma where cells are parted by ";")'
    marks = {mark for cell in cells for mark in ",." if mark in cell} if sheet.decimal_comma else set()
    if len(marks) > 1:
        hint = "use one decimal mark throughout the column, and none for thousands"
        faults.add(f'column "{label}"', "both , and . in the numbers", "one decimal mark", hint)
    for cell, line in zip(cells, sheet.lines, strict=True):
        try:
            numbers.append(_number(cell, decimal_comma=sheet.decimal_comma) if cell else 0.0)  # a gap was noted before
        except ValueError:
            faults.add(f'line {line}, column "{label}"', shown(cell), allowed, "mend the cell, or delete the line")
    return numbers


def _times(sheet: Sheet, cells: list[str], wanted: Wanted, faults: _Faults) -> Floats:
    try:
        _number(next((cell for cell in cells if cell), "0"), decimal_comma=sheet.decimal_comma)
    except ValueError:
        return _stamps(sheet, cells, wanted.time, faults)
    numbers = np.array(_numbers(sheet, cells, wanted.time, faults))
    try:
        return numbers * to_si(1.0, wanted.time_unit, "time")
    except ValueError:
        faults.add("time_unit", shown(wanted.time_unit), 'a unit of time such as "s", "min", "h"', "write one of these")
        return numbers


def _stamps(sheet: Sheet, cells: list[str], label: str, faults: _Faults) -> Floats:
    stamps: list[datetime] = []
    allowed = "a number, or a time stamp as in ISO 8601 such as 2024-05-01 06:30:00, the same way in every row"
    for cell, line in zip(cells, sheet.lines, strict=True):
        if not cell:
            continue  # the gap was noted before
        try:
            stamp = datetime.fromisoformat(cell)
            if stamps and (stamp.tzinfo is None) != (stamps[0].tzinfo is None):
                raise ValueError("with and without a time zone")
            stamps.append(stamp)
        except ValueError:
            faults.add(f'line {line}, column "{label}"', shown(cell), allowed, "mend the cell, or delete the line")
    return np.array([(stamp - stamps[0]).total_seconds() for stamp in stamps])


def _check_order(sheet: Sheet, t: Floats, wanted: Wanted, faults: _Faults) -> None:
    step = np.diff(t)
    for i in np.flatnonzero(step < 0.0).tolist():
        value = f"{shown(sheet.rows[i + 1][sheet.header.index(wanted.time)])}, earlier than the row before"
        faults.add(f"line {sheet.lines[i + 1]}", value, "times that only go on", "sort the rows by time")
    for i in np.flatnonzero(step == 0.0).tolist():
        third = i > 0 and step[i - 1] == 0.0
        if not wanted.jumps or third:
            hint = (
                "delete one of the rows" if third or wanted.jumps else "delete one of the rows, or state jumps = true"
            )
            value = f"the same time as line {sheet.lines[i]}"
            faults.add(
                f"line {sheet.lines[i + 1]}", value, "each time once (twice for a jump, where jumps = true)", hint
            )
    if wanted.max_gap is not None:
        for i in np.flatnonzero(step > wanted.max_gap).tolist():
            value = f"{step[i]:.6g} s after the row before"
            allowed = f"at most {wanted.max_gap:.6g} s between rows, as max_gap states"
            faults.add(f"line {sheet.lines[i + 1]}", value, allowed, "fill the gap, or allow a longer one")
