"""A stock's property curves as a PNG file."""

import textwrap
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from numpy.typing import NDArray

from fem.atomic import whole_file
from fem.quantities.units import celsius
from fem.stock.models import Stock, stock_table
from fem.stock.properties import Property

PANELS = (
    ("conductivity", "conductivity, W/(m K)", "#0072B2"),
    ("density", "density, kg/m³", "#E69F00"),
    ("specific_heat", "specific heat, J/(kg K)", "#009E73"),
)
"""Property, axis label, colour; the colours are of the set of Okabe and Ito (2008), safe for colour-blind readers."""

POINTS = 400
WRAP = 54
MARKS = 30
"""Rows of a table that are marked on its curve; more would hide it."""


def _curve(
    own: Property[float], low: float, high: float
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.bool_]]:
    """Return temperatures, values and which of them are rows of the table; all rows in range are among them."""
    rows, _ = own.rows()
    T = np.union1d(np.linspace(low, high, POINTS), rows[(rows >= low) & (rows <= high)])
    values = np.broadcast_to(np.asarray(own.to_law()(T=T), dtype=np.float64), T.shape)
    return T, values, np.isin(T, rows)


def _panel(ax: Axes, stock: Stock, name: str, label: str, colour: str) -> None:
    low, high = stock.valid_range
    T, values, is_row = _curve(stock.properties()[name], low, high)
    ax.plot(celsius(T), values, color=colour, linewidth=1.8)
    if 0 < is_row.sum() <= MARKS:
        ax.plot(celsius(T[is_row]), values[is_row], "o", color=colour, markersize=3.5, clip_on=False)
    if np.ptp(values) <= 1e-9 * values[0]:
        ax.set_ylim(0.0, 2.0 * values[0])
    else:
        ax.set_ylim(0.0, 1.08 * float(values.max()))
    ax.set_xlim(celsius(low), celsius(high))
    ax.set_title(label, fontsize=10, loc="left")
    ax.set_xlabel("temperature, °C", fontsize=9)
    ax.tick_params(labelsize=8)
    ax.grid(visible=True, color="0.88", linewidth=0.6)
    ax.spines[["top", "right"]].set_visible(False)
    source, kind = stock.source_of(name)
    text = "\n".join(textwrap.wrap(f"[{kind}] {source}", WRAP))
    ax.text(0.0, -0.24, text, transform=ax.transAxes, fontsize=7, color="0.25", va="top")


def plot_stock(stock: Stock, path: Path) -> Path:
    """Draw conductivity, density and specific heat over the range of validity, each with its source, into a PNG file.

    Parameters
    ----------
    stock : Stock
        What to draw.
    path : Path
        The file; it appears whole or not at all.

    Returns
    -------
    Path
        The file written.

    Raises
    ------
    DocketError
        If the stock states no range.
    OSError
        If the file cannot be written.
    """
    stock_table(stock, 2)  # refuses a stock without a range
    figure = Figure(figsize=(11.0, 4.6), dpi=130, facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.subplots(1, len(PANELS))
    for ax, (name, label, colour) in zip(axes, PANELS, strict=True):
        _panel(ax, stock, name, label, colour)
    figure.suptitle(stock.name, x=0.06, ha="left", fontsize=13, fontweight="bold")
    note = "\n".join(textwrap.wrap(stock.note, 165))
    figure.text(0.06, 0.905, note, fontsize=8, color="0.25", va="top")
    figure.subplots_adjust(left=0.06, right=0.985, top=0.80, bottom=0.34, wspace=0.24)
    with whole_file(path) as draft:
        figure.savefig(draft, format="png")
    return path
