"""Files and folders that appear whole or not at all."""

import os
import secrets
import shutil
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path


def _draft(target: Path) -> Path:
    """Return a hidden sibling: on the same file system, so that the last rename is one step."""
    return target.with_name(f".{target.name}.{secrets.token_hex(4)}.part")


def _sync(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


@contextmanager
def whole_file(target: Path) -> Iterator[Path]:
    """Give a draft to write; it becomes `target` when the block ends well, and vanishes otherwise.

    Raises
    ------
    OSError
        If the file system refuses.
    """
    draft = _draft(target)
    try:
        yield draft
        _sync(draft)
        draft.replace(target)
        _sync(target.parent)
    finally:
        draft.unlink(missing_ok=True)


@contextmanager
def whole_folder(target: Path) -> Iterator[Path]:
    """Give an empty draft folder to fill; it replaces `target` when the block ends well, and vanishes otherwise.

    A folder cannot be exchanged for another in one portable step: an older `target` is moved aside first, and put
    back when the new one cannot take its place.

    Raises
    ------
    OSError
        If the file system refuses.
    """
    draft = _draft(target)
    draft.mkdir(parents=True)
    try:
        yield draft
        for path in (*draft.rglob("*"), draft):
            _sync(path)
        _take_place(draft, target)
        _sync(target.parent)
    finally:
        shutil.rmtree(draft, ignore_errors=True)


def _take_place(draft: Path, target: Path) -> None:
    aside = _draft(target)
    with suppress(FileNotFoundError):
        target.replace(aside)
    try:
        draft.replace(target)
    except BaseException:
        if aside.exists():
            aside.replace(target)
        raise
    shutil.rmtree(aside, ignore_errors=True)
