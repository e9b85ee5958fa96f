"""A docket packed with its logs, and what is refused when one is opened.

Bounds: at most 64 files, 64 MB each and 256 MB together when unpacked, 2 MB for the docket's text. Nothing is unpacked
to disk. Refused are paths that lead out, absolute paths, links, encrypted and doubled files.
"""

import io
import stat
import zipfile
from collections.abc import Callable
from pathlib import Path, PurePosixPath

from fem.errors import DocketError, shown
from fem.schedules.log_folder import MAX_BYTES, LogFolder

SUFFIX = ".docket.toml"
MAX_TEXT = 2_000_000
MAX_MEMBERS = 64
MAX_TOTAL = 256_000_000

EPOCH = (1980, 1, 1, 0, 0, 0)
"""The earliest time that a zip can state: stamps would make equal dockets differ."""

Refuse = Callable[[str, str, str], DocketError]


def open_zip(path: Path) -> tuple[str, str, LogFolder]:
    """Return the docket's file name, its text, and its logs.

    Raises
    ------
    DocketError
        If the zip is no sound docket zip.
    """

    def refuse(value: str, allowed: str, hint: str) -> DocketError:
        return DocketError.single("zip", value, allowed, hint, file=path.name)

    try:
        with zipfile.ZipFile(path) as archive:
            members = _members(archive, refuse)
    except (OSError, zipfile.BadZipFile, NotImplementedError, RuntimeError, EOFError) as error:
        raise refuse(str(error), "a zip file that can be read", "pack the docket again") from error
    dockets = [name for name in members if name.endswith(SUFFIX) and "/" not in name]
    if len(dockets) != 1:
        raise refuse(f"{len(dockets)} dockets", f"one NAME{SUFFIX}, not in a folder", "pack the docket again")
    text = members.pop(dockets[0])
    if len(text) > MAX_TEXT:
        raise refuse(f"{len(text)} bytes of docket", f"at most {MAX_TEXT} bytes", "move long tables into CSV logs")
    try:
        return dockets[0], text.decode("utf-8-sig"), LogFolder(members=members)
    except UnicodeDecodeError as error:
        raise refuse(f"byte {error.start}", "text in UTF-8", "save the docket as UTF-8") from error


def zip_bytes(name: str, text: str, logs: dict[str, bytes]) -> bytes:
    """Return the zip of a docket's text and its logs; the same content gives the same bytes.

    Raises
    ------
    DocketError
        If there are too many logs for the zip to be opened again.
    """
    if len(logs) + 1 > MAX_MEMBERS or sum(map(len, logs.values())) > MAX_TOTAL:
        allowed = f"at most {MAX_MEMBERS - 1} logs and {MAX_TOTAL} bytes"
        raise DocketError.single("zip", f"{len(logs)} logs", allowed, "thin the logs or join them", file=name)
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for member, content in {name: text.encode(), **logs}.items():
            entry = zipfile.ZipInfo(str(PurePosixPath(member.replace("\\", "/"))), EPOCH)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            archive.writestr(entry, content)
    return stream.getvalue()


def _members(archive: zipfile.ZipFile, refuse: Refuse) -> dict[str, bytes]:
    """Return the files of an archive by name, within the bounds.

    Raises
    ------
    DocketError
    """
    entries = [entry for entry in archive.infolist() if not entry.is_dir()]
    if len(entries) > MAX_MEMBERS:
        raise refuse(f"{len(entries)} files", f"at most {MAX_MEMBERS} files", "pack only the docket and its logs")
    members: dict[str, bytes] = {}
    room = MAX_TOTAL
    for entry in entries:
        name = _safe(entry, refuse)
        if name in members:
            raise refuse(shown(name), "each file once", "pack the docket again")
        most = min(MAX_BYTES, room)
        with archive.open(entry) as stream:
            content = stream.read(most + 1)  # the size that the archive states is not to be trusted
        if len(content) > most:
            allowed = f"at most {MAX_BYTES} bytes a file and {MAX_TOTAL} together, unpacked"
            raise refuse(f"{shown(name)}, larger than {most} bytes", allowed, "thin the logs")
        members[name] = content
        room -= len(content)
    return members


def _safe(entry: zipfile.ZipInfo, refuse: Refuse) -> str:
    """Return a member's name if it stays inside.

    Raises
    ------
    DocketError
    """
    name = entry.filename
    path = PurePosixPath(name)
    if "\\" in name or ":" in name or path.is_absolute() or ".." in path.parts or not path.parts:
        raise refuse(shown(name), "paths that stay inside the zip", "pack the docket again")
    if stat.S_ISLNK(entry.external_attr >> 16):
        raise refuse(shown(name), "files, no links", "pack the file that the link leads to")
    return str(path)
