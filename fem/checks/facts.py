"""What every check may look at."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.results.figures import Figures
from fem.results.history import Key
from fem.runs.study import Study
from fem.solve.problem import Problem
from fem.solve.run import Gauges

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Goal:
    """A band that is asked for.

    Attributes
    ----------
    key : Key
        The series.
    wanted : float
        Band asked for, in the series' unit.
    why : str
        Who asks: the wanted band, or a limit that is too close to call.
    start, end : float
        Only instants in this span count, s.
    everywhere : bool
        True when every instant of the grid counts, False when only the reporting times do.
    """

    key: Key
    wanted: float
    why: str
    start: float = -np.inf
    end: float = np.inf
    everywhere: bool = False

    def counts(self, figures: Figures) -> NDArray[np.bool_]:
        """Return which instants of the grid count, (n,) bool."""
        grid = figures.grid
        span = (grid.t >= self.start) & (grid.t <= self.end)
        return span if self.everywhere else span & grid.reported


@dataclass(frozen=True)
class RegionStock:
    """The stock of one region as far as the checks need it.

    Attributes
    ----------
    region, stock : str
    low, high : float
        Range in which the stock's values are stated, K; infinite where none is.
    """

    region: str
    stock: str
    low: float
    high: float


@dataclass(frozen=True)
class Facts:
    """A finished study with its figures, goals and data."""

    study: Study
    problem: Problem
    figures: Figures
    gauges: Gauges
    goals: tuple[Goal, ...]
    stocks: tuple[RegionStock, ...]
    names: "Namer"


@dataclass(frozen=True)
class Namer:
    """Writes numbers for people in the docket's units.

    Attributes
    ----------
    length_factor, time_factor : float
        Metres and seconds per unit.
    length_unit, time_unit, temperature_unit : str
    """

    length_factor: float = 1.0
    length_unit: str = "m"
    time_factor: float = 1.0
    time_unit: str = "s"
    temperature_unit: str = "K"

    def length(self, metres: float) -> str:
        """Return a length with its unit."""
        return f"{metres / self.length_factor:.4g} {self.length_unit}"

    def time(self, seconds: float) -> str:
        """Return a time with its unit."""
        return f"{seconds / self.time_factor:.4g} {self.time_unit}"

    def place(self, x: float, y: float) -> str:
        """Return a point as text."""
        return f"({x / self.length_factor:.4g}, {y / self.length_factor:.4g}) {self.length_unit}"

    def temperature(self, kelvin: float, decimals: int = 1) -> str:
        """Return a temperature with its unit."""
        value = {"degC": kelvin - 273.15, "degF": (kelvin - 273.15) * 1.8 + 32.0}.get(self.temperature_unit, kelvin)
        sign = {"degC": "°C", "degF": "°F"}.get(self.temperature_unit, "K")
        return f"{value:.{decimals}f} {sign}"

    def difference(self, kelvin: float) -> str:
        """Return a temperature difference with its unit."""
        return f"{kelvin * 1.8:.3g} °F" if self.temperature_unit == "degF" else f"{kelvin:.3g} K"
