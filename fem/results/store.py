"""Records on disk: one folder each, in open formats, written whole or not at all, refused when damaged.

A folder holds ``record.json`` (figures' names, verdicts, findings, turns, facts), ``figures.npz``, ``mesh.npz``,
``fields.npz`` (the arrays), ``docket.toml`` and ``SHA256SUMS``, which ``sha256sum -c SHA256SUMS`` checks without
this program. Nothing is pickled. JSON has no infinities: they stand as the texts "Infinity", "-Infinity" and "NaN".

The shelf of a docket is the folder ``NAME.records`` beside it; a record lies there under its kind and the start of
its content hash.
"""

import hashlib
import json
import re
from dataclasses import fields as parts_of
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import ValidationError

from fem.atomic import whole_folder
from fem.errors import StoreError
from fem.results.bands import Grid
from fem.results.figures import Figures
from fem.results.history import Key
from fem.results.record import FORMAT, Fields, Record, RecordMesh
from fem.results.store_head import Head

HEAD, SUMS, DOCKET = "record.json", "SHA256SUMS", "docket.toml"
FINISHED, INTERRUPTED, UNFINISHED = "finished", "interrupted", "unfinished"
HASH_DIGITS = 12

Arrays = dict[str, NDArray[Any]]


# --- the shelf ------------------------------------------------------------------------------------


def shelf_of(docket: Path) -> Path:
    """Return the folder in which the records of a docket lie.

    Examples
    --------
    >>> shelf_of(Path("jobs/deck.docket.toml")).as_posix(), shelf_of(Path("deck.docket.zip")).as_posix()
    ('jobs/deck.records', 'deck.records')
    """
    return docket.with_name(re.sub(r"(\.docket)?(\.toml|\.zip)?$", "", docket.name, count=1) + ".records")


def place_on(shelf: Path, content_hash: str, kind: str, outcome: str = FINISHED) -> Path:
    """Return the folder of a record; one of work that did not finish lies apart, and never in a finished one's place."""
    name = f"{kind.replace(' ', '-')}-{content_hash[:HASH_DIGITS]}"
    if outcome == FINISHED:
        return shelf / name
    return shelf / f"{name}-{INTERRUPTED if outcome == INTERRUPTED else UNFINISHED}"


def find(shelf: Path, content_hash: str, kind: str) -> Path | None:
    """Return the folder of the record that answers a docket, or None when the work is still to be done.

    A record of work that did not finish answers nothing, and one whose docket held callables is never found: its hash does not
    know their content.

    Raises
    ------
    StoreError
        If a record lies there but is damaged or of an unknown format.
    """
    folder = place_on(shelf, content_hash, kind)
    if not folder.exists():
        return None
    head = _read_head(folder)
    same = head.content_hash == content_hash and head.kind == kind
    return folder if same and head.shelvable and head.outcome == FINISHED else None


# --- writing --------------------------------------------------------------------------------------


def save(record: Record, folder: Path) -> Path:
    """Write a record into a folder of its own, which appears whole or not at all; an older one there is replaced.

    Temperature fields are kept in single precision, 6e-8 of their value; everything else as it is.

    Raises
    ------
    StoreError
        If the disk refuses.
    """
    names, label = np.unique(np.array(record.mesh.facet_labels, dtype=np.str_), return_inverse=True)
    try:
        with whole_folder(folder) as draft:
            text = Head.of(record, tuple(str(name) for name in names)).model_dump_json(indent=1)
            (draft / HEAD).write_text(text + "\n", encoding="utf-8")
            (draft / DOCKET).write_text(record.docket_text, encoding="utf-8", newline="")
            for name, arrays in _arrays(record, label).items():
                _write_arrays(draft / name, arrays)
            files = sorted(path.name for path in draft.iterdir())
            (draft / SUMS).write_text("".join(f"{_sum(draft / name)}  {name}\n" for name in files), encoding="utf-8")
    except OSError as error:
        raise StoreError(f"the record could not be written to {folder}: {error.strerror or error}") from error
    return folder


def _write_arrays(path: Path, arrays: Arrays) -> None:
    pickled = [name for name, array in arrays.items() if array.dtype.hasobject]
    if pickled:
        raise TypeError(f"{', '.join(pickled)}: an array of object type would be pickled")
    save_arrays: Any = np.savez_compressed  # its stubs take every keyword for the one flag it has
    save_arrays(path, **arrays)


def _arrays(record: Record, label: NDArray[np.intp]) -> dict[str, Arrays]:
    figures, mesh = record.figures, record.mesh
    series = {name: getattr(figures, name) for name in ("value", "space", "time", "order")}
    return {
        "figures.npz": {**_plain(figures.grid), **series},
        "mesh.npz": {
            **{n: getattr(mesh, n) for n in ("points", "cells", "region", "facets")},
            "facet_label": label.ravel(),
        },
        "fields.npz": {**_plain(record.fields), "T": record.fields.T.astype(np.float32)},
    }


def _plain(part: Grid | Fields) -> Arrays:
    return {field.name: getattr(part, field.name) for field in parts_of(part)}


def _sum(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


# --- reading --------------------------------------------------------------------------------------


def load(folder: Path) -> Record:
    """Return the record that lies in a folder.

    Raises
    ------
    StoreError
        If there is none, or it is damaged, half-written or of a format that this program does not know.
    """
    head = _read_head(folder)
    _check_sums(folder)
    try:
        grid = _load_arrays(folder / "figures.npz")
        series = {name: grid.pop(name) for name in ("value", "space", "time", "order")}
        keys = tuple(Key(kind, name) for kind, name in head.series)
        mesh, fields = _load_arrays(folder / "mesh.npz"), _load_arrays(folder / "fields.npz")
        labels = tuple(head.facet_labels[i] for i in mesh.pop("facet_label"))
        fields["T"] = fields["T"].astype(np.float64)
        return head.record(
            docket_text=(folder / DOCKET).read_bytes().decode("utf-8"),
            figures=Figures(keys, Grid(**grid), **series),
            mesh=RecordMesh(**mesh, region_names=head.region_names, facet_labels=labels),
            fields=Fields(**fields),
        )
    except (OSError, ValueError, KeyError, IndexError, TypeError) as error:
        raise StoreError(f"{folder} is no whole record: {error}") from error


def _load_arrays(path: Path) -> Arrays:
    with np.load(path, allow_pickle=False) as file:
        return {name: file[name] for name in file.files}


def _read_head(folder: Path) -> Head:
    try:
        text = (folder / HEAD).read_text(encoding="utf-8")
        known = json.loads(text)
    except FileNotFoundError:
        raise StoreError(f"{folder} holds no record: {HEAD} is missing") from None
    except (OSError, ValueError) as error:
        raise StoreError(f"{folder} is no whole record: {HEAD} cannot be read ({error})") from error
    if not isinstance(known, dict) or "format" not in known:
        raise StoreError(f"{folder} is no whole record: {HEAD} states no format number")
    if known["format"] != FORMAT:
        raise StoreError(
            f"{folder} has record format {known['format']!r}; this program reads format {FORMAT}. "
            "Read it with the version that wrote it, or run the docket again"
        )
    try:
        return Head.model_validate_json(text)
    except ValidationError as error:
        where = ", ".join(sorted({".".join(str(part) for part in problem["loc"]) for problem in error.errors()}))
        raise StoreError(f"{folder} is no whole record: {HEAD} does not hold what it must ({where})") from error


def _check_sums(folder: Path) -> None:
    try:
        lines = (folder / SUMS).read_text(encoding="utf-8").splitlines()
        sums = {name: checksum for checksum, name in (line.split("  ", 1) for line in lines)}
    except FileNotFoundError:
        raise StoreError(f"{folder} is no whole record: {SUMS} is missing") from None
    except (OSError, ValueError) as error:
        raise StoreError(f"{folder} is no whole record: {SUMS} cannot be read ({error})") from error
    for name in (HEAD, DOCKET, "figures.npz", "mesh.npz", "fields.npz"):
        path = folder / name
        if not path.is_file():
            raise StoreError(f"{folder} is no whole record: {name} is missing")
        if sums.get(name) != _sum(path):
            raise StoreError(f"{folder} is damaged: {name} is not what was written")
