"""From pydantic's list of errors to problems in the user's words."""

from collections.abc import Iterable
from typing import Any

from pydantic_core import InitErrorDetails

from fem.errors import DocketError, Problem, Said, shown
from fem.quantities.strict import nearest, unknown_key
from fem.stock.models import PROPERTIES, Stock

LISTS = ("region", "exposure", "gauge", "limit", "variant")
"""Lists of a docket whose parts have names."""


def docket_error(faults: Iterable[Any], linked: Iterable[InitErrorDetails], data: dict[str, Any]) -> DocketError:
    """Return the error that holds every fault once, in the order of the docket.

    Parameters
    ----------
    faults : iterable
        What pydantic's ``errors()`` lists.
    linked : iterable of InitErrorDetails
        Faults between the parts.
    data : dict
        What was read, for the names of the parts.
    """
    problems = [
        _problem(line["loc"], line["type"], line["msg"], line.get("ctx", {}), line["input"], data)
        for line in _each_log_once(faults)
    ]
    for line in linked:
        kind = line["type"]
        context = {} if isinstance(kind, str) else kind.context or {}
        problems.append(_problem(line.get("loc", ()), "refused", "", context, line["input"], data))
    return DocketError(dict.fromkeys(problems))


def _each_log_once(faults: Iterable[Any]) -> list[Any]:
    """Return the faults without those of a log that were listed where another value reads the same log."""
    seen: set[tuple[Any, ...]] = set()
    kept = []
    for line in faults:
        last = str(line["loc"][-1]) if line["loc"] else ""
        of_log = line["loc"][:1] != ("variant",) and (last == "log" or ", " in last)  # "kiln.csv, line 3"
        about = (last, str(line["input"]), line["msg"])
        if not of_log or about not in seen:
            kept.append(line)
        seen.add(about)
    return kept


def _problem(
    loc: tuple[Any, ...], kind: str, msg: str, ctx: dict[str, Any], value: Any, data: dict[str, Any]
) -> Problem:
    place = words(loc, data)
    found = "" if value is None or kind == "missing" else shown(value)
    if kind == "refused":
        return Problem(place, found, ctx["allowed"], ctx["hint"])
    if kind == "missing":
        return Problem(place, "", f"{loc[-1]} is required", f"add {loc[-1]}")
    if kind == "extra_forbidden":
        allowed, hint = unknown_key(str(loc[-1]), _stock_keys(loc))
        return Problem(place, found, allowed, hint)
    if kind == "tuple_type" and isinstance(value, dict) and str(loc[-1]).removesuffix("s") in LISTS:
        name = str(loc[-1]).removesuffix("s")
        return Problem(place, shown(Said(f"[{name}]")), f"[[{name}]], once for each", brackets_hint(name))
    if kind == "literal_error":
        expected = str(ctx["expected"]).replace("'", '"')
        close = nearest(str(value), [word.strip('" ') for word in expected.replace(" or ", ",").split(",")])
        return Problem(place, found, expected, f'did you mean "{close}"?' if close else "use one of these")
    allowed = msg.removeprefix("Value error, ").removeprefix("Input should be ").removeprefix("Assertion failed, ")
    return Problem(place, found, allowed, MENDS.get(kind, "change it accordingly"))


def brackets_hint(name: str) -> str:
    """Return how to mend a list of tables whose heading stands in single brackets."""
    return f"write [[{name}]] in double brackets: there may be several"


MENDS = {
    "string_type": "put it in quotes",
    "bool_type": "write true or false",
    "int_type": "write a whole number",
    "tuple_type": "write a list in square brackets",
    "dict_type": "write a table",
    "model_type": "write a table in braces, or with its own heading",
    "model_attributes_type": "write a table in braces, or with its own heading",
    "too_short": "add what is missing",
    "too_long": "drop what is too much",
}


def _stock_keys(loc: tuple[Any, ...]) -> list[str]:
    """Return the keys that stand where a stock or one of its properties holds an unknown one."""
    if len(loc) > 3 and loc[2] in PROPERTIES:
        return ["value", "table", "range", "source", "kind"]
    return [key for key in Stock.model_fields if key != "name"]


def words(loc: tuple[Any, ...], data: dict[str, Any]) -> str:
    """Return a place in the user's words.

    Examples
    --------
    >>> words(("exposure", 0, "film", "coefficient"), {"exposure": [{"name": "kiln"}]})
    'exposure "kiln", film.coefficient'
    >>> words(("section", "region", 0, "outline", 2, "via"), {"section": {"region": [{"name": "deck"}]}})
    'region "deck", edge 3, via'
    """
    parts, table = list(loc), data
    if len(parts) > 1 and parts[0] == "section" and parts[1] in ("region", "regions"):
        table = _get(data, "section")
        parts = parts[1:]
    head = str(parts.pop(0)) if parts else "docket"
    single = head.removesuffix("s")
    if single in LISTS and parts and isinstance(parts[0], int):
        i = parts.pop(0)
        head = _named(single, i, table)
    elif head == "stock" and parts:
        head = f'stock "{parts.pop(0)}"'
    return ", ".join([head, *_rest(parts)])


def _get(table: Any, key: str) -> Any:
    return table.get(key) if isinstance(table, dict) else getattr(table, key, None)


def _named(single: str, i: int, table: Any) -> str:
    items = _get(table, single) or _get(table, f"{single}s")
    item = items[i] if isinstance(items, list | tuple) and i < len(items) else None
    name = _get(item, "name")
    number = f" {i + 1}" if single == "limit" or not name else ""
    return f"{single}{number}" + (f' "{name}"' if name else "")


def _rest(parts: list[Any]) -> list[str]:
    """Return the rest of a place: keys joined by dots, rows and corners counted from one."""
    out: list[str] = []
    joined = ""
    previous = ""
    for i, part in enumerate(parts):
        if isinstance(part, int):
            if joined and previous != "outline":
                out.append(joined)
            joined = ""
            out.append(_count(previous, part, parts[i + 1 :]))
            previous = f"{previous} row" if previous != "outline" else ""
        elif " " in str(part):
            out += [joined] if joined else []
            out.append(str(part))
            joined = ""
        else:
            joined = f"{joined}.{part}" if joined else str(part)
            previous = str(part)
    return [*out, joined] if joined else out


def _count(previous: str, index: int, after: list[Any]) -> str:
    if previous == "outline":
        return f"{'corner' if after[:1] in (['x'], ['y']) else 'edge'} {index + 1}"
    if previous.endswith(" row"):
        return f"column {index + 1}"
    if previous == "steps":
        return f"step {index + 1}"
    return f"{'row' if after[:1] and isinstance(after[0], int) else 'item'} {index + 1}"
