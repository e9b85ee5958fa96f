"""From a docket to the tables and rows of its file, and changes to these by path."""

import types
from collections.abc import Mapping
from typing import Annotated, Any, Union, get_args, get_origin

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from fem.errors import DocketError, Problem, shown
from fem.laws import Law
from fem.quantities.strict import Strict, unknown, unknown_key
from fem.quantities.units import FileUnits, Quantity, written
from fem.schedules.base import OwnKind
from fem.schedules.models import Schedule, Scheduled
from fem.stock.models import PROPERTIES

FORMAT = 1
"""Of the files that are written, and the newest that is read."""

Form = dict[str, Any]
"""A docket in the file's terms: tables, lists, numbers in the file's units, text."""


class Writer:
    """Writes models in the file's terms.

    Parameters
    ----------
    units : FileUnits
        Of bare numbers.
    live : bool
        Whether laws and callables may stay as they are; a file can't hold them.
    """

    def __init__(self, units: FileUnits, *, live: bool) -> None:
        self.units, self.live = units, live

    def model(self, part: BaseModel, kind: str = "") -> Any:
        """Return a model as its table or short form, without what stands at its default."""
        table: Form = {}
        for name, field in type(part).model_fields.items():
            value = getattr(part, name)
            if field.exclude or value is None or _stands_at_default(field, value):
                continue
            annotation: Any = field.annotation
            for mark in field.metadata:
                annotation = Annotated[annotation, mark]
            table[field.alias or name] = self.value(value, annotation, kind)
        if isinstance(part, Schedule):
            self._default_units(table, kind)
        return type(part).to_short(table) if isinstance(part, Strict) else table

    def _default_units(self, table: Form, kind: str) -> None:
        """Leave out the units of a log that are those of the file anyway."""
        if "log" in table:
            for name, what in (("time_unit", "time"), ("unit", kind)):
                if table.get(name) == self.units.of(what):
                    del table[name]

    def value(self, value: Any, annotation: Any, kind: str) -> Any:
        """Return a value of a field with this annotation, inside a schedule of this kind."""
        if value is None or isinstance(value, bool | str):
            return value
        mark = next((m for m in _marks(annotation) if isinstance(m, Quantity | Scheduled | OwnKind)), None)
        if isinstance(mark, Scheduled):
            return self._scheduled(value, mark.kind)
        if isinstance(mark, Quantity):
            return written(float(value), mark.kind, self.units)
        if isinstance(mark, OwnKind):
            return written(float(value), mark.kind_in(kind), self.units)
        if isinstance(value, BaseModel):
            return self.model(value, kind)
        if isinstance(value, tuple):
            inner = _items(annotation, len(value))
            return [self.value(item, kind_of, kind) for item, kind_of in zip(value, inner, strict=True)]
        if isinstance(value, Mapping):
            return {key: self.value(item, Any, kind) for key, item in value.items()}
        if isinstance(value, Law) or callable(value):
            return self._callable(value)
        return value

    def _scheduled(self, value: Any, kind: str) -> Any:
        if isinstance(value, Schedule):
            return self.model(value, kind)
        if isinstance(value, int | float):
            return written(float(value), kind, self.units)
        return self._callable(value)

    def _callable(self, value: Any) -> Any:
        if not self.live:
            allowed, hint = "data only: numbers, text, schedules, tables", "write the values as points or a table"
            raise DocketError.single("docket", shown(value), allowed, hint)
        return value


def _stands_at_default(field: FieldInfo, value: Any) -> bool:
    return not field.is_required() and bool(value == field.get_default(call_default_factory=True))


def _marks(annotation: Any) -> tuple[Any, ...]:
    """Return the marks of an annotation, through any wrapping and through ``| None``."""
    if get_origin(annotation) is Annotated:
        return (*_marks(get_args(annotation)[0]), *annotation.__metadata__)
    return _marks(_some(annotation)) if _some(annotation) is not annotation else ()


def _some(annotation: Any) -> Any:
    """Return X for ``X | None``; anything else as it is."""
    if get_origin(annotation) in (Union, types.UnionType):
        rest = [arg for arg in get_args(annotation) if arg is not type(None)]
        return rest[0] if len(rest) == 1 else annotation
    return annotation


def _items(annotation: Any, n: int) -> list[Any]:
    """Return the annotations of the n items of a tuple."""
    bare = _some(annotation)
    while get_origin(bare) is Annotated:
        bare = _some(get_args(bare)[0])
    args = get_args(bare) if get_origin(bare) is tuple else ()
    if len(args) == 2 and args[1] is Ellipsis:
        return [args[0]] * n
    return list(args) if len(args) == n else [Any] * n


def stock_form(table: Form) -> Form:
    """Return a stock with its properties in their short forms: a number, rows, or a table of their own."""
    out = {key: value for key, value in table.items() if key != "name"}
    for key in PROPERTIES:
        if isinstance(out.get(key), dict) and len(out[key]) == 1:
            out[key] = next(iter(out[key].values()))
    return out


LISTED = ("region", "exposure", "gauge", "limit", "variant")
"""What a file holds as an array of tables; the rest are tables."""


def arranged(table: Form, units: FileUnits) -> Form:
    """Return a docket's table in the order of its file, with the header, every part present even when empty."""
    section = dict(table["section"])
    head = {"format": FORMAT, "title": table.get("title", "")}
    head |= {"length": units.length, "time": units.time, "temperature": units.temperature}
    form: Form = {"docket": head, "section": section, "region": section.pop("region")}
    form["stock"] = {name: stock_form(stock) for name, stock in table.get("stock", {}).items()}
    form["exposure"] = table.get("exposure", [])
    form["clock"] = table.get("clock", {"steady": True})
    for key in ("start", "gauge", "limit", "wanted", "allowance", "sources", "variant"):
        form[key] = table.get(key, [] if key in LISTED else {})
    return form


def changed(form: Form, changes: Mapping[str, Any]) -> Form:
    """Return a form with the values at some paths changed.

    Parameters
    ----------
    form : dict
        It is copied, not changed.
    changes : mapping
        Path such as ``exposure.kiln.film.coefficient`` and new value, in the file's terms.

    Raises
    ------
    DocketError
        With every path that leads nowhere.
    """
    form = _copied(form)
    problems: list[Problem] = []
    for path, value in changes.items():
        try:
            _change(form, path, value)
        except DocketError as error:
            problems += error.problems
    if problems:
        raise DocketError(problems)
    return form


def _copied(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _copied(item) for key, item in value.items()}
    return [_copied(item) for item in value] if isinstance(value, list) else value


def _change(form: Form, path: str, value: Any) -> None:
    here: Any = form
    words = path.split(".")
    done = 0
    while True:
        step = _longest(here, words[done:])
        if step is None:
            if isinstance(here, dict) and done == len(words) - 1 and done > 0:
                here[words[-1]] = value  # a key that was left out: whether it may stand here is judged as in a file
                return
            known = [str(_label(item)) for item in here] if isinstance(here, list) else _keys(here)
            what = f'below "{".".join(words[:done])}":' if done else "the tables"
            allowed, hint = (unknown if isinstance(here, list) else unknown_key)(
                what=what, word=words[done], known=known
            )
            raise DocketError.single(path, shown(value), allowed, hint)
        key, count = step
        done += count
        if done == len(words):
            here[key] = value
            return
        here = here[key]


def _keys(here: Any) -> list[str]:
    return list(here) if isinstance(here, dict) else []


def _label(item: Any) -> Any:
    return item.get("name", "") if isinstance(item, dict) else ""


def _longest(here: Any, words: list[str]) -> tuple[Any, int] | None:
    """Return the key or index that the most words together name, since names of stock may hold dots."""
    for count in range(len(words), 0, -1):
        word = ".".join(words[:count])
        if isinstance(here, dict) and word in here:
            return word, count
        if isinstance(here, list):
            found = [i for i, item in enumerate(here) if word == _label(item) != ""]
            if found:
                return found[0], count
    return None
