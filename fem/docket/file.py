"""Docket files: ``NAME.docket.toml``, and ``.zip`` with its logs. The only reader and writer of either.

`fem.docket.toml_text` reads TOML; files that exist are changed through tomlkit, which keeps comments and layout.
"""

from dataclasses import replace
from pathlib import Path
from typing import Any

from fem.atomic import whole_file
from fem.docket.archive import MAX_TEXT, SUFFIX, open_zip, zip_bytes
from fem.docket.form import FORMAT, changed
from fem.docket.models import FILE_KEYS, Docket, as_meant
from fem.docket.text import merged, new_text
from fem.docket.toml_text import read_toml
from fem.errors import DocketError, Problem, shown
from fem.quantities.strict import unknown, unknown_key
from fem.quantities.units import LENGTHS, TEMPERATURES, TIMES, FileUnits, Reading
from fem.schedules.log_folder import LogFolder
from fem.schedules.models import Log

HEADER = {"length": LENGTHS, "time": TIMES, "temperature": TEMPERATURES}


def read_docket(path: Path | str) -> Docket:
    """Return the docket of a ``.docket.toml`` file, with the logs beside it, or of a ``.zip`` that holds both.

    Raises
    ------
    DocketError
        With every problem of the file.
    """
    path = Path(path)
    if path.suffix == ".zip":
        name, text, logs = open_zip(path)
        return read_text(text, logs=logs, file=f"{path.name}/{name}")
    return read_text(_file_text(path), logs=LogFolder(path.parent), file=path.name)


def _file_text(path: Path) -> str:
    if not path.name.endswith(SUFFIX):
        allowed = f"a file called NAME{SUFFIX}, or a .zip"
        raise DocketError.single("docket", shown(path.name), allowed, "rename it", file=path.name)
    try:
        if path.stat().st_size > MAX_TEXT:
            hint = "move long tables into CSV logs"
            raise DocketError.single(
                "docket", f"{path.stat().st_size} bytes", f"at most {MAX_TEXT} bytes", hint, file=path.name
            )
        return path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise DocketError.single(
            "docket", f"byte {error.start}", "text in UTF-8", "save it as UTF-8", file=path.name
        ) from error
    except OSError as error:
        beside = [p.name for p in path.parent.glob(f"*{SUFFIX}")] if path.parent.is_dir() else []
        allowed, hint = unknown("a readable file:", path.name, beside)
        raise DocketError.single(
            "docket", f"{shown(path.name)} ({error.strerror})", allowed, hint, file=path.name
        ) from error


def read_text(text: str, *, logs: LogFolder, file: str = "") -> Docket:
    """Return the docket that a text holds.

    Parameters
    ----------
    text : str
        TOML.
    logs : LogFolder
        Where its logs are found.
    file : str
        The file's name, for messages.

    Raises
    ------
    DocketError
        With every problem of the text.
    """
    try:
        units, title, problems, data = _header(read_toml(text))
        try:
            docket = Docket.read({**data, "title": title, "units": units}, Reading(units=units, logs=logs))
        except DocketError as error:
            raise DocketError(dict.fromkeys((*problems, *error.problems, *_lost_paths(as_meant(data)[0])))) from None
        if problems:
            raise DocketError(problems)
    except DocketError as error:
        raise error.in_file(file) from None
    return docket


def _header(data: dict[str, Any]) -> tuple[FileUnits, str, list[Problem], dict[str, Any]]:
    """Return units, title, problems and the rest of a file.

    Raises
    ------
    DocketError
        If the format is not one that can be read: nothing else in the file has a known meaning then.
    """
    data = dict(data)
    head = data.pop("docket", None)
    if not isinstance(head, dict):
        hint = f'begin the file with [docket], format = {FORMAT}, length = "mm", time = "min", temperature = "degC"'
        raise DocketError.single("docket", "", "a table [docket]", hint)
    given = head.get("format")
    if type(given) is not int or given != FORMAT:
        newer = type(given) is int and given > FORMAT
        hint = "update the program, or ask for the file in this format" if newer else f"write format = {FORMAT}"
        raise DocketError.single("docket, format", "" if given is None else shown(given), f"{FORMAT}", hint)
    problems = []
    for key in head.keys() - {"format", "title", *HEADER}:
        allowed, hint = unknown_key(key, ("format", "title", *HEADER))
        problems.append(Problem(f"docket, {key}", shown(head[key]), allowed, hint))
    units = {"length": "mm", "time": "s", "temperature": "degC"}
    for key, choices in HEADER.items():
        try:
            if key not in head:
                problems.append(Problem(f"docket, {key}", "", ", ".join(choices), f'write {key} = "{choices[0]}"'))
            else:
                units[key] = getattr(FileUnits(**{key: head[key]}), key)
        except DocketError as error:
            problems += error.problems
    for key in ("title", "units"):
        if key in data:
            problems.append(Problem(key, shown(data.pop(key)), f"{key} inside [docket]", "move it there"))
    problems += _python_names(data)
    return FileUnits(**units), head.get("title", ""), sorted(problems, key=lambda p: p.place), data


def _python_names(data: dict[str, Any]) -> list[Problem]:
    """Return the problems of keys that stand in Python only: ``gauges`` is called ``gauge`` in a file."""
    found = [key for key in data if key in Docket.model_fields and key not in FILE_KEYS]
    return [Problem(key, shown(data[key]), *unknown_key(key, FILE_KEYS)) for key in found]


def _lost_paths(data: dict[str, Any]) -> list[Problem]:
    """Return the problems of the variants' paths, for a docket that has others."""
    problems = []
    for variant in data.get("variant", ()) if isinstance(data.get("variant"), list) else ():
        changes = variant.get("changes") if isinstance(variant, dict) else None
        try:
            changed(data, changes if isinstance(changes, dict) else {})
        except DocketError as error:
            problems += [replace(p, place=f'variant "{variant.get("name")}", {p.place}') for p in error.problems]
    return problems


def to_text(docket: Docket) -> str:
    """Return a docket as the text of a new file.

    Raises
    ------
    DocketError
        If it holds a law or callable.
    """
    return _checked(new_text(docket.to_form()), docket)


def update_text(text: str, docket: Docket) -> str:
    """Return the text of a file changed so that it holds the docket; comments and layout stay where nothing changed.

    Arrays of tables that stand mixed (a region, a gauge, a region) are brought together when anything changes.

    Parameters
    ----------
    text : str
        A sound docket file; its logs are those of the docket.

    Raises
    ------
    DocketError
        If the text is no sound docket, or the docket holds a law or callable.
    """
    old = read_text(text, logs=docket.logs)
    if old == docket:
        return text
    same_units = old.units == docket.units
    return _checked(merged(text, old.to_form() if same_units else None, docket.to_form()), docket)


def _checked(text: str, docket: Docket) -> str:
    if read_text(text, logs=docket.logs) != docket:
        raise AssertionError("a docket was written that does not read back the same: this is a bug, nothing was saved")
    return text


def write_docket(docket: Docket, path: Path | str) -> None:
    """Write a docket; an existing file keeps its comments and layout where nothing changed. Atomic.

    Raises
    ------
    DocketError
        If the docket holds a law or callable, a log is not beside the file, or the existing file is no sound docket.
    """
    path = Path(path)
    if not path.name.endswith(SUFFIX):
        raise DocketError.single(
            "docket", shown(path.name), f"a file called NAME{SUFFIX}", "choose such a name", file=path.name
        )
    _logs_beside(docket, path)
    text = update_text(_file_text(path), docket) if path.exists() else to_text(docket)
    with whole_file(path) as draft:
        draft.write_bytes(text.encode())


def pack(path: Path | str, to: Path | str | None = None) -> Path:
    """Pack a docket file with its logs; the zip stands beside it as NAME.zip unless said otherwise. Atomic.

    Raises
    ------
    DocketError
        If the file is no sound docket, or too large to be read again.
    """
    path = Path(path)
    docket, text = read_docket(path), _file_text(path)
    target = Path(to) if to is not None else path.with_name(path.name.removesuffix(SUFFIX) + ".zip")
    names = dict.fromkeys(log.log for log in logs_of(docket))
    content = zip_bytes(path.name, text, {name: docket.logs.read(name) for name in names})
    with whole_file(target) as draft:
        draft.write_bytes(content)
    return target


def _logs_beside(docket: Docket, path: Path) -> None:
    """Refuse to write a docket where its logs are not, or are others.

    Raises
    ------
    DocketError
    """
    problems: list[Problem] = []
    beside = LogFolder(path.parent)
    for log in logs_of(docket):
        try:
            same = log.reads(beside)
        except DocketError as error:
            problems += error.problems
            continue
        if not same:
            hint = "copy the docket's own log there, or read the docket again"
            problems.append(Problem("log", shown(log.log), "a log with the numbers that the docket holds", hint))
    if problems:
        raise DocketError(dict.fromkeys(problems)).in_file(path.name)


def logs_of(part: Any) -> list[Log]:
    """Return every log that a docket, or a part of one, refers to; one entry per reference."""
    if isinstance(part, Log):
        return [part]
    if hasattr(type(part), "model_fields"):
        return [log for name in type(part).model_fields for log in logs_of(getattr(part, name))]
    if isinstance(part, tuple):
        return [log for item in part for log in logs_of(item)]
    return []
