"""One property of a stock: a constant, a table over temperature or a law, with its range of validity and its source."""

from collections.abc import Callable
from itertools import pairwise
from typing import Any, Generic, Literal, Self, TypeVar

import numpy as np
from numpy.typing import NDArray
from pydantic import ConfigDict, Field, model_validator

from fem.errors import DocketError, refusal
from fem.laws import Law, as_law, constant
from fem.quantities.strict import Strict
from fem.quantities.units import Temperature

Floats = NDArray[np.float64]
Value = TypeVar("Value")

SourceKind = Literal[
    "published",
    "published, extended",
    "published, as remembered",
    "common practice, no source",
    "from memory",
    "stated in the docket",
]
"""How far a value can be traced.

published: the source is named, and the value was checked against a second carrier of it.
published, extended: as published, but derived from it or carried past its range by a rule that the source text states.
published, as remembered: the source is named, the value was written from memory of it; look it up before you sign.
common practice, no source: what the trade uses.
from memory: typical figures without a traceable source.
stated in the docket: whoever wrote the docket answers for it.
"""

TRIAL_T = (283.15, 303.15)
"""K, where a law without a stated range is tried out."""


def table_law(T: Floats, values: Floats) -> Law:
    """Return the law that is linear between the rows and constant beyond the first and the last.

    Parameters
    ----------
    T : (n,) array
        K, increasing.
    values : (n,) array
        In the property's SI unit.
    """
    return Law(lambda T, rows=T, values=values: np.interp(T, rows, values), frozenset({"T"}), name="table over T")


def read_pasted(text: str) -> list[list[str | float]]:
    """Split a table pasted from a spreadsheet: one row a line, cells apart by a tab, a semicolon or spaces.

    A cell that is a plain number becomes one; any other stays text with its unit.

    Raises
    ------
    PydanticCustomError
        If a row does not have two cells, or a cell holds a comma: `7,5` could be 7.5 or 75.
    """
    rows = [_cells(number, line.strip()) for number, line in enumerate(text.splitlines(), start=1) if line.strip()]
    return [[_number(cell) for cell in row] for row in rows]


def _cells(number: int, line: str) -> list[str]:
    allowed = "rows of temperature and value, one row a line, no heading"
    if "," in line:
        raise refusal(
            allowed, f"in row {number} write a decimal point, and part the cells by a tab, ';' or spaces, not a comma"
        )
    part = next((mark for mark in (";", "\t") if mark in line), None)
    cells = [cell.strip() for cell in line.split(part)]
    if len(cells) != 2:
        raise refusal(allowed, f"give row {number} two cells; it has {len(cells)}")
    return cells


def _number(cell: str) -> str | float:
    try:
        return float(cell)
    except ValueError:
        return cell


class Property(Strict, Generic[Value]):
    """A property over temperature; exactly one of `value`, `table` and `law` is given.

    It may be written as a bare number, as rows, as a pasted table, as a callable or a `Law`, or with its keys.
    """

    model_config = ConfigDict(
        revalidate_instances="never"
    )  # what was made is SI: a file's units must not touch it again

    value: Value | None = Field(None, description="Constant, in the property's unit, above zero.")
    table: tuple[tuple[Temperature, Value], ...] | None = Field(
        None,
        description="Two or more rows of temperature and value, rising; linear between rows, constant beyond them.",
    )
    law: Law | None = Field(None, description="Python only: a law or callable of T [K] (and x, y [m]), in SI.")
    range: tuple[Temperature, Temperature] | None = Field(
        None, description="Lowest and highest temperature for which the property is meant; by default the table's ends."
    )
    source: str | None = Field(None, description="Where the values come from; by default the stock's source.")
    kind: SourceKind | None = Field(None, description="How far the values can be traced; by default the stock's kind.")

    @classmethod
    def from_short(cls, data: Any) -> Any:
        """Return the table of keys that a number, rows, a pasted table, a callable or a law stand for."""
        if isinstance(data, Property):
            return data
        if isinstance(data, Law) or callable(data):
            data = {"law": data}
        elif isinstance(data, np.ndarray | list | tuple) or (isinstance(data, str) and "\n" in data.strip()):
            data = {"table": data}
        elif not isinstance(data, dict):
            data = {"value": data}
        return {key: _spread(key, given) for key, given in data.items()}

    @model_validator(mode="after")
    def _whole(self) -> Self:
        given = [name for name in ("value", "table", "law") if getattr(self, name) is not None]
        if len(given) != 1:
            raise refusal("exactly one of value, table and law", f"given: {', '.join(given) or 'none'}; keep one")
        if self.range is not None and not self.range[0] < self.range[1]:
            raise refusal("a range from a lower to a higher temperature", "swap or mend the two temperatures")
        if self.table is not None:
            self._rising([row[0] for row in self.table])
        if self.law is not None:
            self._try_law(self.law)
        return self

    @staticmethod
    def _rising(T: list[float]) -> None:
        if len(T) < 2:
            raise refusal("a table of two rows or more", "add a row, or write the value alone if it is a constant")
        for row, (before, after) in enumerate(pairwise(T), start=2):
            if not before < after:
                raise refusal(
                    "a table whose temperatures rise from row to row",
                    f"row {row} is not above row {row - 1}; sort the rows, and spread a jump over a small span",
                )

    def _try_law(self, law: Law) -> None:
        T = np.linspace(*(self.range or TRIAL_T), 5)
        place = np.zeros_like(T)
        allowed = "a callable of numpy arrays that returns one finite value above zero for each temperature"
        try:
            values = np.broadcast_to(np.asarray(law(T=T, x=place, y=place), dtype=np.float64), T.shape)
        except (TypeError, ValueError) as error:
            raise refusal(allowed, f"called with five temperatures it failed: {error}") from error
        good = np.isfinite(values) & (values > 0.0)
        if not np.all(good):
            hint = f"it is not at {T[~good][0]:g} K; state a range if it is meant for other temperatures"
            raise refusal(allowed, hint)

    def to_law(self) -> Law:
        """Return the property as a law of T [K] in SI; a table goes on constant beyond its ends."""
        if self.law is not None:
            return self.law
        if self.table is not None:
            T, values = self.rows()
            return table_law(T, values)
        return constant(float(self.value))  # type: ignore[arg-type]

    def rows(self) -> tuple[Floats, Floats]:
        """Return the table's temperatures, K, and values, both of shape (n,); empty without a table."""
        pairs = np.array(self.table if self.table is not None else np.zeros((0, 2)), dtype=np.float64)
        return pairs[:, 0].copy(), pairs[:, 1].copy()

    def extent(self) -> tuple[float, float] | None:
        """Return the stated range or else the table's ends, K; None where neither says anything."""
        if self.range is not None:
            return self.range
        return None if self.table is None else (self.table[0][0], self.table[-1][0])


def _spread(key: str, given: Any) -> Any:
    if key == "table" and isinstance(given, str):
        return read_pasted(given)
    if key == "table" and isinstance(given, np.ndarray):
        return given.tolist()
    if key == "law" and given is not None:
        return _law_of(given)
    return given


def _law_of(value: Law | Callable[..., Any]) -> Law:
    try:
        return as_law(value, allowed=("T", "x", "y"))
    except DocketError as error:
        problem = error.problems[0]
        raise refusal(problem.allowed, problem.hint) from error
