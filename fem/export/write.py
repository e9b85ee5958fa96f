"""A record in open formats, for other programs. Reads a record, never solves."""

from collections.abc import Callable, Iterable
from pathlib import Path

from fem.errors import StoreError
from fem.export.fields import write_fields, write_mesh
from fem.export.figures import write_figures
from fem.export.histories import write_histories
from fem.results.record import Record

WRITERS: dict[str, tuple[str, Callable[[Record, Path], Path]]] = {
    "histories": ("histories.csv", write_histories),
    "fields": ("fields", write_fields),
    "mesh": ("mesh.msh", write_mesh),
    "figures": ("figures.json", write_figures),
}
"""File or folder name and writer of each part of a record that can be exported."""


def export(record: Record, parts: Iterable[str], folder: Path) -> tuple[Path, ...]:
    """Write parts of a record into a folder, which is made if need be; each file appears whole or not at all.

    Parameters
    ----------
    parts : iterable of str
        Keys of `WRITERS`.

    Returns
    -------
    tuple of Path
        What was written.

    Raises
    ------
    StoreError
        If the disk refuses.
    KeyError
        If a part is none of `WRITERS`.
    """
    jobs = [WRITERS[part] for part in parts]
    try:
        folder.mkdir(parents=True, exist_ok=True)
        return tuple(write(record, folder / name) for name, write in jobs)
    except OSError as error:
        raise StoreError(f"the export to {folder} broke off: {error.strerror or error}") from error
