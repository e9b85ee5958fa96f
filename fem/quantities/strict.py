"""The base of every model of a docket: frozen, strict, and helpful about keys that it does not know."""

import difflib
from collections.abc import Iterable
from typing import Any, ClassVar, NoReturn

from pydantic import BaseModel, ConfigDict, ModelWrapValidatorHandler, ValidationError, model_validator
from pydantic_core import InitErrorDetails, PydanticCustomError

from fem.errors import refusal

LIKE = 0.6
"""Least likeness (difflib's ratio) of a word that is suggested; our own judgement, no source."""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return the known word that is most like this one, or an empty text when none is.

    Examples
    --------
    >>> nearest("conductivty", ["density", "conductivity"])
    'conductivity'
    >>> nearest("zzz", ["density"])
    ''
    """
    folded = {name.casefold(): name for name in known}
    close = difflib.get_close_matches(str(word).casefold(), folded, n=1, cutoff=LIKE)
    return folded[close[0]] if close else ""


def unknown(what: str, word: str, known: Iterable[str]) -> tuple[str, str]:
    """Return what is allowed, and how to mend it, for a name that is not among the known ones, the nearest first.

    Names are quoted: they may hold blanks and commas.

    Examples
    --------
    >>> unknown("the gauges", "rin", ["bore, middle", "rim"])
    ('the gauges "rim", "bore, middle"', 'did you mean "rim"?')
    >>> unknown("a readable file:", "x.csv", [])
    ('a readable file: there is none', 'check the name, or add what is missing')
    """
    return _choice(what, word, known, '"{}"')


def unknown_key(word: str, known: Iterable[str], what: str = "the keys") -> tuple[str, str]:
    """Return the same for a word of the file's own language, which stands in no quotes there.

    Examples
    --------
    >>> unknown_key("emisivity", ["surroundings", "emissivity"])
    ('the keys emissivity, surroundings', 'did you mean "emissivity"?')
    """
    return _choice(what, word, known, "{}")


def _choice(what: str, word: str, known: Iterable[str], form: str) -> tuple[str, str]:
    known = tuple(dict.fromkeys(known))
    if not known:
        return f"{what.removesuffix(':')}: there is none", "check the name, or add what is missing"
    close = nearest(word, known)
    ordered = sorted(known, key=lambda name: name != close)
    return (
        f"{what} {', '.join(form.format(name) for name in ordered)}",
        f'did you mean "{close}"?' if close else "use one of these",
    )


def tuples(value: Any) -> Any:
    """Return lists as tuples, all the way down; TOML and people write lists, frozen models hold tuples."""
    return tuple(tuples(item) for item in value) if isinstance(value, list | tuple) else value


def carried(error: Any) -> InitErrorDetails:
    """Return one line of a validation error so that it can be raised again within another one."""
    kind = PydanticCustomError(error["type"], "{message}", {"message": error["msg"], **error.get("ctx", {})})
    return InitErrorDetails(type=kind, loc=error["loc"], input=error["input"])


def _plain(lines: list[Any]) -> list[Any]:
    """Return the lines without those that only say that too few sound items are left of a list with faulty ones."""
    deeper = {line["loc"][:n] for line in lines for n in range(1, len(line["loc"]))}
    return [line for line in lines if line["type"] != "too_short" or line["loc"] not in deeper]


class Strict(BaseModel):
    """A frozen part of a docket. A field marked `exclude` has no place in a file.

    A field may have an alias: the key under which it stands in a file. Both spellings are accepted, so that the same
    model is filled by hand in Python and from a file.
    """

    model_config = ConfigDict(
        frozen=True,
        strict=True,
        extra="forbid",
        validate_by_name=True,
        validate_by_alias=True,
        revalidate_instances="always",
        arbitrary_types_allowed=True,
    )

    HINTS: ClassVar[dict[str, str]] = {}
    """How to mend a key that is missing, or one that users are known to try."""

    SPELLED: ClassVar[dict[str, str]] = {}
    """Fields that a file fills by another key, which has an entry in `HINTS`."""

    @classmethod
    def file_keys(cls) -> tuple[str, ...]:
        """Return the keys that a file may use."""
        return tuple(field.alias or name for name, field in cls.model_fields.items() if not field.exclude)

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Return the table that a short form stands for; a model that has a short form overrides this."""
        return data

    @classmethod
    def to_short(cls, table: dict[str, Any]) -> Any:
        """Return what a file holds for this table; a model that has a short form overrides this."""
        return table

    @model_validator(mode="wrap")
    @classmethod
    def _name_strangers(cls, data: Any, handler: ModelWrapValidatorHandler["Strict"]) -> "Strict":
        data = cls.from_short(data)
        if not isinstance(data, dict):
            return handler(data)
        known = {*cls.file_keys(), *cls.model_fields}
        strangers = [key for key in data if key not in known]
        whole = {key: tuples(value) for key, value in data.items() if key in known}
        lines = []
        for key in strangers:
            allowed, hint = unknown_key(key, cls.file_keys())
            lines.append(InitErrorDetails(type=refusal(allowed, cls.HINTS.get(key, hint)), loc=(key,), input=data[key]))
        try:
            model = handler(whole)
        except ValidationError as error:
            lines += [cls._missing(line) or carried(line) for line in _plain(error.errors(include_url=False))]
        if lines:
            raise ValidationError.from_exception_data(cls.__name__, lines)
        return model

    @classmethod
    def _missing(cls, line: Any) -> InitErrorDetails | None:
        """Return a fault that says what a missing key of this model is, None for any other fault."""
        if line["type"] != "missing" or len(line["loc"]) != 1:
            return None
        key = str(line["loc"][0])
        if key in cls.SPELLED:
            key = cls.SPELLED[key]
            return InitErrorDetails(type=refusal(f"{key} is required", cls.HINTS[key]), loc=(key,), input=None)
        field = next((field for name, field in cls.model_fields.items() if key in (name, field.alias)), None)
        what = "" if field is None or not field.description else f": {field.description.rstrip('.')}"
        return InitErrorDetails(type=refusal(f"{key}{what}", cls.HINTS.get(key, f"add {key}")), loc=(key,), input=None)


def fault(loc: tuple[int | str, ...], value: Any, allowed: str, hint: str) -> InitErrorDetails:
    """Return one line of a validation error, for a validator that finds several faults at once."""
    return InitErrorDetails(type=refusal(allowed, hint), loc=loc, input=value)


def raise_one(loc: tuple[int | str, ...], value: Any, allowed: str, hint: str) -> NoReturn:
    """Raise one fault at a place inside the part that is being read."""
    raise ValidationError.from_exception_data("docket", [fault(loc, value, allowed, hint)])


def raise_all(title: str, faults: list[InitErrorDetails]) -> None:
    """Raise the faults together, if there are any.

    Raises
    ------
    ValidationError
        That holds them all.
    """
    if faults:
        raise ValidationError.from_exception_data(title, faults)
