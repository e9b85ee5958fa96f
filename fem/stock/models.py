"""Stock: what a region is made of, and the library of stocks that comes with the program.

The files in `data` speak the docket's own form, so that an entry can be copied into a docket and changed there.
"""

import difflib
import itertools
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any, NamedTuple, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import ConfigDict, Field, model_validator

from fem.errors import DocketError, refusal
from fem.laws import Law, constant
from fem.quantities.strict import Strict
from fem.quantities.units import Conductivity, Density, FileUnits, SpecificHeat, Temperature
from fem.stock.properties import Property, SourceKind

Floats = NDArray[np.float64]

PROPERTIES = ("conductivity", "density", "specific_heat")


class Stock(Strict):
    """What a region is made of.

    Each property is a constant, a table over temperature or, in Python, a law or callable of T [K]; see `Property`.
    """

    model_config = ConfigDict(
        revalidate_instances="never"
    )  # what was made is SI: a file's units must not touch it again

    name: str = Field("", description="The stock's name; in a docket the key under which it stands.")
    family: str = Field("own", description="The group under which it is listed.")
    aliases: tuple[str, ...] = Field((), description="Other names by which it may be searched for.")
    conductivity: Property[Conductivity] = Field(description="Thermal conductivity, W/(m K), above zero.")
    density: Property[Density] = Field(
        description="Density, kg/m3, above zero; of a solid the cold one, because the section does not grow."
    )
    specific_heat: Property[SpecificHeat] = Field(
        description="Specific heat at constant pressure, J/(kg K), above zero."
    )
    range: tuple[Temperature, Temperature] | None = Field(
        None, description="Lowest and highest temperature for every property that states no range of its own."
    )
    source: str | None = Field(
        None, description="Where the values come from, for every property that states no source of its own."
    )
    kind: SourceKind = Field(
        "stated in the docket", description="How far the values can be traced, where a property does not say."
    )
    note: str = Field("", description="What a user must know: what is left out, where it stops to hold.")

    @model_validator(mode="after")
    def _ranges_meet(self) -> Self:
        if self.range is not None and not self.range[0] < self.range[1]:
            raise refusal("a range from a lower to a higher temperature", "swap or mend the two temperatures")
        low, high = self.valid_range
        if not low < high:
            raise refusal("ranges of the properties that overlap", f"mend the ranges: {self._ranges_text()}")
        return self

    def _ranges_text(self) -> str:
        ranges = {name: self.range_of(name) for name in PROPERTIES}
        return "; ".join(f"{name} {r[0]:g} to {r[1]:g} K" for name, r in ranges.items() if r is not None)

    def properties(self) -> dict[str, Property[float]]:
        """Return conductivity, density and specific heat by name."""
        return {name: getattr(self, name) for name in PROPERTIES}

    def range_of(self, name: str) -> tuple[float, float] | None:
        """Return one property's range of validity, K: its own, else the stock's, else its table's ends, else None."""
        own = self.properties()[name]
        return own.range or self.range or own.extent()

    def source_of(self, name: str) -> tuple[str, SourceKind]:
        """Return one property's source text and kind."""
        own = self.properties()[name]
        return own.source or self.source or "no source stated", own.kind or self.kind

    @property
    def valid_range(self) -> tuple[float, float]:
        """The temperatures, K, for which every property is meant; 0 and infinity where none states a range."""
        ranges = [r for name in PROPERTIES if (r := self.range_of(name)) is not None]
        return max((low for low, _ in ranges), default=0.0), min((high for _, high in ranges), default=float("inf"))

    def without_range(self) -> tuple[str, ...]:
        """Return the names of the properties whose range is stated nowhere, so that no check can watch them."""
        return tuple(name for name in PROPERTIES if self.range_of(name) is None)

    def k_law(self) -> Law:
        """Return the conductivity, W/(m K), as a law of T [K]."""
        return self.conductivity.to_law()

    def heat_capacity_law(self) -> Law:
        """Return density times specific heat, J/(m3 K), as a law of T [K]."""
        rho, c = self.density.to_law(), self.specific_heat.to_law()
        if rho.constant and c.constant:
            return constant(rho() * c())

        def product(**given: Any) -> Any:
            return rho(**given) * c(**given)

        return Law(product, rho.needs | c.needs, name="density times specific heat")


class StockTable(NamedTuple):
    """A stock's properties at some temperatures; every array has the shape (n,)."""

    T: Floats
    """K."""
    conductivity: Floats
    """W/(m K)."""
    density: Floats
    """kg/m3."""
    specific_heat: Floats
    """J/(kg K)."""
    diffusivity: Floats
    """m2/s, conductivity over density times specific heat."""


def stock_table(stock: Stock, n: int = 9, within: tuple[float, float] | None = None) -> StockTable:
    """Return the properties at n temperatures evenly over the range of validity.

    Parameters
    ----------
    stock : Stock
        What to show.
    n : int
        How many temperatures, at least 2.
    within : (low, high), optional
        K; by default the stock's range of validity.

    Raises
    ------
    DocketError
        If the stock states no range and none is given.
    """
    low, high = within or stock.valid_range
    if not np.isfinite(high):
        raise DocketError.single(
            f"stock {stock.name!r}, range",
            "none",
            "a lowest and a highest temperature",
            "state the range for which the values hold",
        )
    T = np.linspace(low, high, n)
    k, rho, c = (np.broadcast_to(p.to_law()(T=T), T.shape).astype(np.float64) for p in stock.properties().values())
    return StockTable(T, k, rho, c, k / (rho * c))


@cache
def library() -> Mapping[str, Stock]:
    """Return the library's stocks by name, in the order of its files; read once, on first use."""
    stocks: dict[str, Stock] = {}
    folder = files("fem.stock") / "data"
    for file in sorted(folder.iterdir(), key=lambda entry: entry.name):
        if not file.name.endswith(".toml"):
            continue
        content = tomllib.loads(file.read_text(encoding="utf-8"))
        head = content["docket"]
        units = FileUnits(length=head["length"], time=head["time"], temperature=head["temperature"])
        for name, entry in content["stock"].items():
            stocks[name] = Stock.model_validate({"name": name, **entry}, context=units)
    return MappingProxyType(stocks)


def find(text: str) -> list[Stock]:
    """Return the library's stocks in whose name, aliases or family every word of the text occurs; best matches first.

    Examples
    --------
    >>> [stock.name for stock in find("insulating 1260")]
    ['insulating brick L1260']
    >>> find("unobtainium")
    []
    """
    words = text.casefold().split()
    scored = []
    for stock in library().values():
        places = [place.casefold() for place in (stock.name, " ".join(stock.aliases), stock.family)]
        ranks = [_rank(word, places) for word in words]
        if None not in ranks:
            scored.append((sum(rank for rank in ranks if rank is not None), stock))
    return [stock for _, stock in sorted(scored, key=lambda pair: pair[0])]


def _rank(word: str, places: list[str]) -> int | None:
    """Return 0 for a word that begins a word of the first place, more for later places and for hits inside a word."""
    begins = (i for i, place in enumerate(places) if f" {word}" in f" {place}")
    inside = (len(places) + i for i, place in enumerate(places) if word in place)
    return next(itertools.chain(begins, inside), None)


def nearest(name: str, n: int = 3) -> list[str]:
    """Return what a name that the library has not may have meant: up to n stocks that hold its words, or else the most alike one.

    Examples
    --------
    >>> nearest("fireclay brik")[0]
    'fireclay brick'
    """
    owner = {label.casefold(): stock.name for stock in library().values() for label in (*stock.aliases, stock.name)}
    worded = [stock.name for stock in find(name)] if name.strip() else []
    alike = difflib.get_close_matches(name.casefold(), owner, n=1, cutoff=0.6)
    return worded[:n] or [owner[label] for label in alike]
