"""The work behind `look` and `vouch`: read the docket, find or make its record, keep it, show it."""

import os
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any

from fem.cli.answer import BAD_INPUT, INTERRUPTED, OPEN, VOUCHED, err, out, put_json, say
from fem.cli.tables import show_end, show_record
from fem.cli.watch import Watch
from fem.docket import Docket
from fem.docket.content import content_hash
from fem.docket.file import read_docket
from fem.errors import DocketError, StoreError
from fem.export.figures import figures_of
from fem.results import store
from fem.results.numbers import Writer
from fem.results.record import Record

QUICK, VOUCH = "quick look", "vouch"


@dataclass(frozen=True)
class Asked:
    """What the command line says about a docket.

    Attributes
    ----------
    docket : Path
    variant : str or None
    changes : dict
        Path in the docket and value, of what the command line changes.
    again, as_json : bool
    """

    docket: Path
    variant: str | None
    changes: dict[str, Any]
    again: bool
    as_json: bool


def asked_for(
    docket: Path,
    *,
    variant: str | None = None,
    band: str | None = None,
    cells: int | None = None,
    seconds: float | None = None,
    again: bool = False,
    as_json: bool = False,
) -> Asked:
    """Return what the options of a command ask for."""
    given = {"wanted.gauges": _number_or_text(band), "allowance.cells": cells, "allowance.seconds": seconds}
    changes = {path: value for path, value in given.items() if value is not None}
    return Asked(docket, variant, changes, again, as_json)


def _number_or_text(text: str | None) -> float | str | None:
    try:
        return None if text is None else float(text)
    except ValueError:
        return text  # with its unit; whether it is one, the docket says


def read(asked: Asked) -> Docket:
    """Return the docket that is meant: its variant, with what the command line changes.

    Raises
    ------
    DocketError
        With every problem.
    """
    docket = read_docket(asked.docket)
    if asked.variant is not None:
        docket = docket.variant(asked.variant)
    if not asked.changes:
        return docket
    try:
        return docket.with_changes(asked.changes)
    except DocketError as error:
        raise error.in_file("command line") from None


@contextmanager
def in_docket(path: Path, docket: Docket) -> Iterator[None]:
    """Name the docket's file in what is found wrong once it was read: its section, its gauges."""
    try:
        yield
    except DocketError as error:
        words = Writer(docket.units).words
        told = (replace(problem, value=words(problem.value)) for problem in error.problems)
        raise DocketError(told).in_file(path.name) from None


def run(asked: Asked, kind: str) -> int:
    """Answer `look` or `vouch`; return the exit code.

    Raises
    ------
    HeatvouchError
        If the docket is refused, or the shelf cannot be written: before the work, not after it.
    """
    docket = read(asked)
    shelf, digest = store.shelf_of(asked.docket), content_hash(docket)
    kept = None if asked.again else on_shelf(shelf, digest, kind)
    if kept is not None:
        folder, record = kept
        say(shelf_text(record))
        _show(asked, record, str(folder))
        return exit_code(record)
    refuse_unwritable(shelf)
    with in_docket(asked.docket, docket):
        record = _work(docket, kind)
    folder = store.place_on(shelf, digest, kind, record.outcome)
    try:
        where = str(store.save(record, folder))
    except StoreError as error:  # the numbers are shown all the same: they may have cost an hour
        _show(asked, record, f"not kept: {error}")
        return BAD_INPUT
    _show(asked, record, where)
    return exit_code(record)


def shelf_text(record: Record) -> str:
    """Return the line that tells that a record was not made now, and that it is open if it is."""
    told = f"read from the shelf, where it lies since {record.created}; --again runs it anew"
    if record.kind == QUICK or record.standing == "vouched":
        return told
    if not record.reasons:
        return f"{told}. This vouch is open"
    first, more = Writer.of(record).words(record.reasons[0].text), len(record.reasons) - 1
    return f"{told}. This vouch is open: {first}" + (f" (and {more} more)" if more else "")


def on_shelf(shelf: Path, digest: str, kind: str) -> tuple[Path, Record] | None:
    """Return the folder and the record that answer a docket; None where none does, or only a damaged one."""
    try:
        folder = store.find(shelf, digest, kind)
        if folder is None:
            _tell_unfinished(shelf, digest, kind)
            return None
        record = store.load(folder)
    except StoreError as error:
        say(f"the record on the shelf is not used: {error}")
        return None
    made_by, this = record.versions.get("heatvouch"), _version()
    if made_by != this:
        say(f"the record on the shelf was made by heatvouch {made_by}; this is {this}")
    return folder, record


def _tell_unfinished(shelf: Path, digest: str, kind: str) -> None:
    """Tell of a record that does not answer the docket, though work went into it."""
    for outcome in (store.INTERRUPTED, store.UNFINISHED):
        folder = store.place_on(shelf, digest, kind, outcome)
        if folder.exists():
            say(f"a {kind} of this docket that did not finish ({outcome}) is not used; it lies in {folder}")


def _version() -> str:
    try:
        return version("heatvouch")
    except PackageNotFoundError:  # run from a source tree that is not installed
        return "not installed"


def refuse_unwritable(shelf: Path) -> None:
    """Refuse a shelf that cannot be written, before hours of work go into a record for it.

    Raises
    ------
    StoreError
        If so.
    """
    folder = shelf if shelf.exists() else shelf.parent
    if not folder.is_dir() or not os.access(folder, os.W_OK):
        raise StoreError(f"records cannot be kept in {shelf}: {folder} cannot be written; copy the docket elsewhere")


def _work(docket: Docket, kind: str) -> Record:
    from fem.vouch import look, vouch

    with Watch(err()) as watch:
        if kind == QUICK:
            return look(docket, on_progress=watch.on_progress, stop=watch.stop)
        return vouch(docket, on_progress=watch.on_progress, on_turn=watch.on_turn, stop=watch.stop)


def _show(asked: Asked, record: Record, where: str) -> None:
    if asked.as_json:
        put_json({**figures_of(record), "record": where})
        return
    console = out()
    show_record(console, record)
    show_end(console, record, where)


def exit_code(record: Record) -> int:
    """Return the exit code that a record stands for."""
    if record.outcome == store.INTERRUPTED:
        return INTERRUPTED
    if record.kind == QUICK:
        return VOUCHED if record.outcome == store.FINISHED else OPEN
    return VOUCHED if record.standing == "vouched" else OPEN
