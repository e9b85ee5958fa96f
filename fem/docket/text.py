"""From tables to TOML text, new or into a text that exists: what did not change keeps its comments and its layout."""

from typing import Any

import tomlkit
from tomlkit.items import AoT, Item, Table

from fem.docket.form import LISTED, Form

SHORT_ROWS = 4
"""A list of rows longer than this has one row a line."""

SUBTABLES = ("changes",)
"""Tables inside a table that have a heading of their own; the rest stand in braces."""


def new_text(form: Form) -> str:
    """Return the text of a new file."""
    document = tomlkit.document()
    for key, value in form.items():
        if value:
            document.add(key, _part(key, value))
    return tomlkit.dumps(document)


def _part(key: str, value: Any) -> Item:
    """Return a top-level part: a table, a table of tables, or an array of tables."""
    if key in LISTED:
        tables = tomlkit.aot()
        for entry in value:
            tables.append(_table(entry))
        return tables
    if key == "stock":
        group = tomlkit.table(is_super_table=True)
        for name, entry in value.items():
            group.add(tomlkit.key(name), _table(entry))
        return group
    return _table(value)


def _table(entry: Form) -> Table:
    table = tomlkit.table()
    for key, value in entry.items():
        table.add(tomlkit.key(key), _table(value) if key in SUBTABLES else _item(value))
    return table


def _item(value: Any) -> Item:
    """Return a value inside a table: long lists with a row a line, tables in braces."""
    if isinstance(value, dict):
        inline = tomlkit.inline_table()
        for key, inner in value.items():
            inline.add(tomlkit.key(key), _item(inner))
        return inline
    if isinstance(value, list | tuple):
        array = tomlkit.array()
        for inner in value:
            array.append(_item(inner))
        rows = any(isinstance(inner, list | tuple | dict) for inner in value)
        array.multiline(multiline=rows and len(value) > SHORT_ROWS)
        return array
    item: Item = tomlkit.item(value)
    return item


def merged(text: str, old: Form | None, new: Form) -> str:
    """Return a text with what differs between two forms changed in it.

    Parameters
    ----------
    text : str
        A sound docket file.
    old : dict or None
        Its form; None to write every value anew, since the file's units change.
    new : dict
        The form to write.
    """
    document = tomlkit.parse(text)
    for key, value in new.items():
        before = None if old is None else old.get(key)
        if key in document and before == value:
            continue
        if not value:
            document.pop(key, None)
        elif key not in document:
            document.add(key, _part(key, value))
        elif key in LISTED:
            document[key] = _list(document[key], before, value)
        elif key == "stock":
            _merge_stock(document, before, value)
        else:
            _merge(document[key], before, value)
    return tomlkit.dumps(document)


def _merge_stock(document: tomlkit.TOMLDocument, old: Form | None, new: Form) -> None:
    group: Any = document["stock"]
    for name in [name for name in group if name not in new]:
        del group[name]
    for name, entry in new.items():
        if name in group:
            _merge(group[name], None if old is None else old.get(name), entry)
        else:
            group.add(tomlkit.key(name), _table(entry))


def _list(found: Any, old: list[Form] | None, new: list[Form]) -> Any:
    """Return an array of tables with the tables of the same name kept."""
    if not isinstance(found, AoT):
        return _part("region", new)
    kept = {str(table.get("name")): table for table in found}
    before = {} if old is None else {entry["name"]: entry for entry in old}
    for entry in new:
        if entry["name"] in kept:
            _merge(kept[entry["name"]], before.get(entry["name"]), entry)
    if list(kept) == [entry["name"] for entry in new]:
        return found
    tables = tomlkit.aot()
    for entry in new:
        tables.append(kept.get(entry["name"]) or _table(entry))
    return tables


def _merge(table: Any, old: Any, new: Form) -> None:
    """Bring one table to its new form."""
    gone = [key for key in table if key not in new and (old is None or key in old)]
    for key in gone:
        del table[key]
    for key, value in new.items():
        before = old.get(key) if isinstance(old, dict) else None
        if key in table and before == value and before is not None:
            continue
        if isinstance(value, dict) and isinstance(before, dict) and isinstance(table.get(key), dict):
            _merge(table[key], before, value)
        else:
            table[key] = _item(value)
