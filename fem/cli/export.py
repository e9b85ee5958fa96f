"""The work behind `export`: a record from the shelf, or a docket with its logs, into open formats."""

import shutil
from pathlib import Path

from fem.atomic import whole_file
from fem.cli.answer import put_json, say, tell
from fem.cli.run import QUICK, VOUCH, asked_for, on_shelf, read
from fem.docket.content import content_hash
from fem.docket.file import pack, read_docket
from fem.errors import DocketError, StoreError
from fem.export.write import WRITERS, export
from fem.results import store
from fem.results.record import Record

DOCKET = "docket"
PARTS = (*WRITERS, DOCKET)


def export_docket(
    docket: Path, what: str, to: Path, *, variant: str | None, record: Path | None, as_json: bool
) -> None:
    """Write the parts that are asked for into a folder, and tell what was written.

    Raises
    ------
    DocketError
        If a part is unknown or the docket is refused.
    StoreError
        If no record answers the docket, or the disk refuses.
    """
    parts = parts_of(what)
    of_record = [part for part in parts if part != DOCKET]
    written = list(export(_record(docket, variant, record), of_record, to)) if of_record else []
    if DOCKET in parts:
        written.append(_pack(docket, to))
    if as_json:
        put_json({"written": [str(path) for path in written]})
        return
    for path in written:
        tell(f"wrote {path}")


def parts_of(what: str) -> list[str]:
    """Return the parts named in a list with commas.

    Raises
    ------
    DocketError
        If one is unknown.
    """
    parts = list(dict.fromkeys(part.strip() for part in what.split(",") if part.strip()))
    unknown = [part for part in parts if part not in PARTS]
    if unknown or not parts:
        found = ", ".join(unknown) or "nothing"
        raise DocketError.single("--what", found, f"{', '.join(PARTS)}, with commas between", "name one or several")
    return parts


def _record(docket: Path, variant: str | None, folder: Path | None) -> Record:
    if folder is not None:
        return store.load(folder)
    shelf, digest = store.shelf_of(docket), content_hash(read(asked_for(docket, variant=variant)))
    for kind in (VOUCH, QUICK):
        kept = on_shelf(shelf, digest, kind)
        if kept is not None:
            say(f"from the {kind} in {kept[0]}")
            return kept[1]
    raise StoreError(
        f"{shelf} holds no record of this docket as it stands: "
        f"run `heatvouch vouch {docket}` first, or name a record with --record"
    )


def _pack(docket: Path, to: Path) -> Path:
    target = to / store.shelf_of(docket).with_suffix(".zip").name
    try:
        to.mkdir(parents=True, exist_ok=True)
        if docket.suffix == ".zip":  # packed already: it is copied, once it was found sound
            read_docket(docket)
            with whole_file(target) as draft:
                shutil.copyfile(docket, draft)
        else:
            pack(docket, target)
    except OSError as error:
        raise StoreError(f"the export to {to} broke off: {error.strerror or error}") from error
    return target
