"""One property of a stock: a constant, a table over temperature or a law, with its range of validity and its source."""

from collections.abc import Callable
from typing import Any, Generic, Literal, Self, TypeVar

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field, model_validator

from fem.errors import DocketError
from fem.laws import Law, as_law, constant
from fem.units import Temperature

Floats = NDArray[np.float64]
Value = TypeVar("Value")

Kind = Literal[
    "published",
    "published, extended",
    "published, as remembered",
    "common practice, no source",
    "from memory",
    "stated in the docket",
]
"""How far a value can be traced.

published: the source is named and the value was checked against a copy of it (a formula's or table's second carrier).
published, extended: as published, and carried on past the source's own range, or derived from it, by a rule that the source text states.
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


def read_pasted(text: str) -> list[list[str]]:
    """Split a table pasted from a spreadsheet: one row a line, cells apart by tab, semicolon or spaces.

    Raises
    ------
    ValueError
        If a row does not have two cells, or a cell holds a comma: `7,5` could be 7.5 or 75.
    """
    rows = []
    for number, line in enumerate(text.splitlines(), start=1):
        if not line.strip():
            continue
        if "," in line:
            raise ValueError(f"row {number} {line.strip()!r}: use a decimal point, and part the cells by a tab, ';' or spaces")
        cells = [cell.strip() for cell in (line.split(";") if ";" in line else line.split("\t") if "\t" in line else line.split())]
        if len(cells) != 2:  # noqa: PLR2004
            raise ValueError(f"row {number} {line.strip()!r}: a row has two cells, temperature and value, and no heading")
        rows.append(cells)
    return rows


class Property(BaseModel, Generic[Value]):
    """A property over temperature; exactly one of `value`, `table` and `law` is given.

    It may be written as a bare number, as rows, as a pasted table, as a callable or a `Law`, or with its keys.
    """

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True)

    value: Value | None = Field(None, description="Constant, in the property's unit, above zero.")
    table: tuple[tuple[Temperature, Value], ...] | None = Field(
        None,
        min_length=2,
        description="Rows of temperature and value, temperatures increasing; linear between rows, constant beyond the ends.",
    )
    law: Law | None = Field(None, description="Python only: a law or callable of T [K] (and x, y [m]), in SI.")
    range: tuple[Temperature, Temperature] | None = Field(
        None, description="Lowest and highest temperature for which the property is meant; by default the table's ends."
    )
    source: str | None = Field(None, description="Where the values come from; by default the stock's source.")
    kind: Kind | None = Field(None, description="How far the values can be traced; by default the stock's kind.")

    @model_validator(mode="before")
    @classmethod
    def _read(cls, data: Any) -> Any:
        if isinstance(data, Law) or callable(data):
            data = {"law": data}
        elif isinstance(data, np.ndarray):
            data = {"table": data.tolist()}
        elif isinstance(data, list | tuple) or (isinstance(data, str) and "\n" in data.strip()):
            data = {"table": data}
        elif not isinstance(data, dict | BaseModel):
            data = {"value": data}
        if isinstance(data, dict):
            data = dict(data)
            if isinstance(data.get("table"), str):
                data["table"] = read_pasted(data["table"])
            if data.get("law") is not None:
                data["law"] = _law_of(data["law"])
        return data

    @model_validator(mode="after")
    def _whole(self) -> Self:
        given = [name for name in ("value", "table", "law") if getattr(self, name) is not None]
        if len(given) != 1:
            raise ValueError(f"give exactly one of value, table and law; given: {', '.join(given) or 'none'}")
        if self.range is not None and not self.range[0] < self.range[1]:
            raise ValueError("the range's first temperature must be below its second")
        if self.table is not None:
            T = [row[0] for row in self.table]
            for i, (before, after) in enumerate(zip(T[:-1], T[1:], strict=True), start=2):
                if not before < after:
                    raise ValueError(f"row {i} of the table: its temperature must be above that of row {i - 1}; spread a jump over a small span")
        if self.law is not None:
            self._try_law(self.law)
        return self

    def _try_law(self, law: Law) -> None:
        T = np.linspace(*(self.range or TRIAL_T), 5)
        place = np.zeros_like(T)
        try:
            values = np.broadcast_to(np.asarray(law(T=T, x=place, y=place), dtype=np.float64), T.shape)
        except (TypeError, ValueError) as error:
            raise ValueError(f"the callable must take numpy arrays and return one value for each temperature: {error}") from error
        if not np.all(np.isfinite(values) & (values > 0.0)):
            worst = T[np.argmin(np.where(np.isfinite(values), values, -np.inf))]
            raise ValueError(f"the callable must be finite and above zero in its range; it is not at {worst:g} K. State a range if it is meant for other temperatures")

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


def _law_of(value: Law | Callable[..., Any]) -> Law:
    try:
        return as_law(value, allowed=("T", "x", "y"))
    except DocketError as error:
        raise ValueError(str(error)) from error
