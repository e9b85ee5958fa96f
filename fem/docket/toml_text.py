"""TOML text to tables, and what a slip of the pen in it probably was. TOML 1.0 (toml.io), by the standard library."""

import re
import tomllib
from typing import Any

from fem.docket.faults import LISTS, brackets_hint
from fem.errors import LONGEST_VALUE, DocketError, Said, shown

PLACE = re.compile(r"(.*) \(at line (\d+), column (\d+)\)", re.DOTALL)
"""How the reader names the place of an error."""

SLIPS: tuple[tuple[re.Pattern[str], str], ...] = (
    (re.compile(r"=\s*([+-]?\d+),(\d+)\s*(#.*)?$"), "write a decimal point, not a comma: {0}.{1}"),
    (re.compile(r"=\s*(True|False|TRUE|FALSE)\b"), "write true or false in small letters"),
    (re.compile(r"=\s*([+-]?\d[\d.]*\s*[^\W\d][^#,\]}]*?)\s*(?:#.*)?$"), 'put a value with its unit in quotes: "{0}"'),
    (re.compile(r"=\s*([^\W\d][^#\"',\]}]*?)\s*(?:#.*)?$"), 'put text in quotes: "{0}"'),
    (re.compile(r"=\s*(\"[^\"]*|'[^']*)$"), "close the quotes at the end of the text"),
    (
        re.compile(r"^\s*\[\[?[^\"'\],]*[^\"'\],\s] +[^\"'\],\s]"),
        'put a name with blanks in quotes: [stock."my brick"]',
    ),
    (re.compile(r"\]\s+\["), "put a comma between the rows"),
    (re.compile(r"^\s*[^=\[#]*$"), "write key = value; inside a list, part the items by commas and close the bracket"),
)
"""What a line that is no TOML looks like, and how it is mended; the first that fits is told."""


def read_toml(text: str) -> dict[str, Any]:
    """Return the tables of a text.

    Raises
    ------
    DocketError
        If it is no TOML: with the offending line, and a guess at what was meant.
    """
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:  # ValueError: also numbers too long for Python to read
        what = "nested too deep" if isinstance(error, RecursionError) else str(error)
        found, hint = _located(text, what)
        raise DocketError.single("text", found, "TOML 1.0 (toml.io)", hint) from error


def _located(text: str, message: str) -> tuple[str, str]:
    """Return the message with the line it speaks of, and how to mend that line."""
    match = PLACE.fullmatch(message)
    if match is None:
        return message, "mend the line that is named"
    what, row, column = match.group(1), int(match.group(2)), int(match.group(3))
    lines = text.split("\n")
    single = _single_brackets(lines, row - 1)
    if single is not None:
        row, name = single
        return f"line {row + 1}: {_quoted(lines[row])}", brackets_hint(name)
    line = lines[row - 1]
    return f"line {row}, column {column}: {_quoted(line, column)} ({what})", _guess(line)


def _quoted(line: str, column: int = 1) -> str:
    """Return a line as a message repeats it; of a long one what stands round the column, which counts from one."""
    begin = max(0, column - 1 - LONGEST_VALUE // 2) if len(line.strip()) > LONGEST_VALUE else 0
    return shown(Said(("…" if begin else "") + line[begin:]))


def _single_brackets(lines: list[str], row: int) -> tuple[int, str] | None:
    """Return where a list of tables that the line goes on with has its heading in single brackets, and its name."""
    head = re.match(r"\s*\[\[?\s*(\w+)\s*\]", lines[row])
    if head is None or head.group(1) not in LISTS:
        return None
    name = head.group(1)
    found = (i for i, line in enumerate(lines[: row + 1]) if re.match(rf"\s*\[\s*{name}\s*\]", line))
    first = next(found, None)
    return None if first is None else (first, name)


def _guess(line: str) -> str:
    for pattern, hint in SLIPS:
        match = pattern.search(line)
        if match is not None:
            return hint.format(*match.groups())
    return "mend the line that is named"
