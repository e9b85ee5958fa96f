"""The fingerprint of a docket: one number for everything that can move a result, and for nothing else.

It does not see title, comments, key order, file units, variants or where a value comes from; it does see what the logs
hold, and the values of library stock, so that a new edition of either is a new job.
"""

import hashlib
import json
import math
import secrets
from collections.abc import Mapping
from typing import Any

import numpy as np
from pydantic import BaseModel

from fem.docket.models import Docket
from fem.laws import Law
from fem.schedules.base import Knotted
from fem.stock.models import PROPERTIES, Stock

SCHEME = "heatvouch docket fingerprint 1"
"""Goes into every hash; a change in what is hashed changes it."""

SILENT = ("title", "units", "variants", "sources", "stock")
"""Fields of a docket that move no number; of its stock, what the regions use is added by its values."""

_PROCESS = secrets.token_hex(16)


class _Canon:
    """Turns a docket into plain lists and text; notes whether it met a callable, which no text can stand for."""

    def __init__(self) -> None:
        self.callables = False

    def of(self, value: Any) -> Any:
        """Return a value in its canonical form."""
        if value is None or isinstance(value, bool | str | int):
            return value if not isinstance(value, int) or isinstance(value, bool) else self.number(value)
        if isinstance(value, float):
            return self.number(value)
        if isinstance(value, Stock):
            return self.stock(value)
        if isinstance(value, Knotted):
            t, v = value.knots()
            return ["knots", [self.number(end) for end in value.span()], _digest(t), _digest(v)]
        if isinstance(value, BaseModel):
            fields = type(value).model_fields
            return [
                type(value).__name__,
                {name: self.of(getattr(value, name)) for name in fields if not fields[name].exclude},
            ]
        if isinstance(value, Mapping):
            return {str(key): self.of(item) for key, item in value.items()}
        if isinstance(value, tuple | list):
            return [self.of(item) for item in value]
        return self.function(value)

    def number(self, value: float) -> str:
        """Return a number exactly; zero has no sign, and an infinite end of a span has its name."""
        return (float(value) + 0.0).hex() if math.isfinite(value) else str(value)

    def stock(self, stock: Stock) -> Any:
        """Return what a stock's values are, and where they hold; not its name or its sources."""
        own = stock.properties()
        values = {name: self.of([own[name].value, own[name].table, own[name].law]) for name in PROPERTIES}
        ranges = {name: self.of(stock.range_of(name)) for name in PROPERTIES}
        return ["stock", values, ranges]

    def function(self, value: Any) -> str:
        """Return what stands for a law or callable: itself, in this process only."""
        self.callables = True
        name = value.name if isinstance(value, Law) else getattr(value, "__qualname__", "callable")
        return f"{_PROCESS} {name} {id(value)}"


def _digest(values: np.ndarray[Any, np.dtype[np.float64]]) -> str:
    return hashlib.sha256((values + 0.0).astype("<f8").tobytes()).hexdigest()


def _canon(docket: Docket) -> tuple[Any, bool]:
    canon = _Canon()
    parts = {name: canon.of(getattr(docket, name)) for name in Docket.model_fields if name not in SILENT}
    used = [None if region.stock is None else canon.of(docket.stock_of(region)) for region in docket.section.regions]
    return [SCHEME, parts, used], canon.callables


def content_hash(docket: Docket) -> str:
    """Return the SHA-256 of everything in a docket that can move a number, as 64 hexadecimal digits.

    A docket with a law or callable has a hash that begins with ``callable-`` and holds in this process only, because
    nothing tells whether two functions are the same.
    """
    parts, callables = _canon(docket)
    text = json.dumps(parts, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    digest = hashlib.sha256(text.encode()).hexdigest()
    return f"callable-{digest}" if callables else digest


def is_shelvable(docket: Docket) -> bool:
    """Return whether a result of this docket can be found again by its hash: not if it holds a law or callable."""
    return not _canon(docket)[1]
