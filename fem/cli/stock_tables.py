"""Stocks as tables for a terminal and as plain data."""

import math
from collections.abc import Iterable
from typing import Any, get_args

import numpy as np
from numpy.typing import NDArray
from rich.console import Console
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from fem.cli.tables import plain_table, under
from fem.quantities.units import celsius
from fem.stock.models import PROPERTIES, Stock
from fem.stock.properties import SourceKind

UNITS = {"conductivity": "W/(m K)", "density": "kg/m³", "specific_heat": "J/(kg K)"}
NAME_WIDTH = 26
"""Characters that a name has to itself in the list, on a screen however narrow."""
ROOM = 293.15
"""K, where a constant is read."""
KINDS: tuple[str, ...] = get_args(SourceKind)
"""How far a value can be traced, from best to least."""


def weakest_kind(stock: Stock) -> str:
    """Return the kind of the least traceable of a stock's values."""
    return max((stock.source_of(name)[1] for name in PROPERTIES), key=KINDS.index)


def listing_table(stocks: Iterable[Stock]) -> Table:
    """Return the list, family by family: values over the range, the weakest kind of source among them."""
    table = plain_table("stock", "k, W/(m K)", "density, kg/m³", "c, J/(kg K)", "holds, °C", "sources")
    table.columns[0].width = NAME_WIDTH
    family = ""
    for stock in stocks:
        if stock.family != family:
            family = stock.family
            table.add_row(Text(family, style="bold"))
        values = [_extent(stock, name) for name in PROPERTIES]
        table.add_row(stock.name, *values, _range(stock.valid_range), weakest_kind(stock))
    return table


def _extent(stock: Stock, name: str) -> str:
    """Return the lowest and highest value over the range of validity."""
    low, high = stock.valid_range
    rows = stock.properties()[name].rows()[0] if math.isfinite(high) else np.array([ROOM])
    T = np.union1d(np.array([low, high]), rows[(rows >= low) & (rows <= high)]) if math.isfinite(high) else rows
    values = np.broadcast_to(np.asarray(stock.properties()[name].to_law()(T=T), dtype=np.float64), T.shape)
    return _between(float(values.min()), float(values.max()))


def _between(low: float, high: float) -> str:
    ends = dict.fromkeys(f"{x:.4g}" for x in (low, high))
    return " to ".join(ends)


def _range(valid: tuple[float, float]) -> str:
    low, high = (float(celsius(end)) for end in valid)
    return f"{low:.0f} to {high:.0f}" if math.isfinite(high) else "not stated"


def show(console: Console, stock: Stock) -> None:
    """Print one stock: note, values over temperature, range and source of each property."""
    console.print(Text(stock.name, style="bold"))
    also = f"; also called {', '.join(stock.aliases)}" if stock.aliases else ""
    console.print(Text(f"{stock.family}{also}", style="dim"))
    if stock.note:
        console.print(Text(stock.note))
    table = Table(
        *("T, °C", "k, W/(m K)", "density, kg/m³", "c, J/(kg K)", "diffusivity, mm²/s"), box=None, padding=(0, 2)
    )
    for column in table.columns:
        column.justify = "right"
    T = table_rows(stock)
    k, rho, c = (np.broadcast_to(p.to_law()(T=T), T.shape) for p in stock.properties().values())
    first = [_range(stock.valid_range)] if _all_constant(stock) else [f"{celsius(t):.5g}" for t in T]
    for t, *values in zip(first, k, rho, c, strict=True):
        alpha = values[0] / (values[1] * values[2])
        table.add_row(t, *(f"{value:.4g}" for value in values), f"{1e6 * alpha:.3g}")
    title = "Values" if _all_constant(stock) else "Values at the rows of their tables, linear between"
    console.print(under(title, table))
    console.print(Text("\nSources", style="bold"))
    for name in PROPERTIES:
        source, kind = stock.source_of(name)
        own = stock.range_of(name)
        held = f", {_range(own)} °C" if own is not None else ", no range stated"
        told = Text(f"{name.replace('_', ' ')}{held}: ", style="bold")
        told.append(f"[{kind}] {source}", style="default not bold")
        console.print(Padding(told, (0, 0, 0, 2)))


def _all_constant(stock: Stock) -> bool:
    return all(not len(own.rows()[0]) for own in stock.properties().values())


def table_rows(stock: Stock) -> NDArray[np.float64]:
    """Return the temperatures, K, (n,) at which any of a stock's properties has a row; one, where all are constant."""
    if _all_constant(stock):
        return np.array([stock.valid_range[0] if math.isfinite(stock.valid_range[1]) else ROOM])
    return np.unique(np.concatenate([own.rows()[0] for own in stock.properties().values()]))


def listing(stock: Stock) -> dict[str, Any]:
    """Return a stock as plain data: each property with its table over temperature (degC), range, source and kind."""
    return {
        "name": stock.name,
        "family": stock.family,
        "aliases": list(stock.aliases),
        "note": stock.note,
        "holds_degC": [float(celsius(end)) for end in stock.valid_range],
        "properties": {name: _property(stock, name) for name in PROPERTIES},
    }


def _property(stock: Stock, name: str) -> dict[str, Any]:
    source, kind = stock.source_of(name)
    T, values = stock.properties()[name].rows()
    own = stock.range_of(name)
    return {
        "unit": UNITS[name].replace("³", "3"),
        "table": [[float(celsius(t)), float(v)] for t, v in zip(T, values, strict=True)] if len(T) else None,
        "constant": stock.properties()[name].value,
        "holds_degC": None if own is None else [float(celsius(end)) for end in own],
        "source": source,
        "kind": kind,
    }
