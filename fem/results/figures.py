"""Every series with its band on one grid, and the figures read off them: peaks, values at an instant. Reading never solves."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.results.bands import Grid
from fem.results.history import Key

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Peak:
    """A highest or lowest value.

    Attributes
    ----------
    value, band : float
        In the unit of the series.
    t, t_low, t_high : float
        When it is reached, s, and the earliest and latest instant at which it may be, given the band.
    """

    value: float
    band: float
    t: float
    t_low: float
    t_high: float


@dataclass(frozen=True)
class Figures:
    """All series of a study on one judging grid.

    Attributes
    ----------
    keys : tuple of Key
    grid : Grid
    value : (n_keys, n) float
        From the finest run.
    space, time : (n_keys, n) float
        Parts of the band; infinite where there is none (a quick look).
    order : (n_keys, n) float
        Observed order in space.
    """

    keys: tuple[Key, ...]
    grid: Grid
    value: Floats
    space: Floats
    time: Floats
    order: Floats

    @property
    def band(self) -> Floats:
        """Return the whole band, (n_keys, n)."""
        return np.asarray(self.space + self.time)

    def row(self, key: Key) -> int:
        """Return the row of a series; KeyError if there is none."""
        try:
            return self.keys.index(key)
        except ValueError:
            raise KeyError(key) from None

    def series(self, key: Key) -> tuple[Floats, Floats]:
        """Return value and band of one series, (n,) each."""
        i = self.row(key)
        return self.value[i], self.band[i]

    def at(self, key: Key, t: float) -> tuple[float, float]:
        """Return value and band at an instant of the grid (before a jump there).

        Raises
        ------
        KeyError
            If the instant is not on the grid: land on it by naming it among the clock's instants.
        """
        near = np.flatnonzero((np.abs(self.grid.t - t) <= 1e-9 * max(abs(t), self.grid.t[-1])) & (self.grid.side < 0))
        if not len(near):
            raise KeyError(t)
        i, j = self.row(key), near[0]
        return float(self.value[i, j]), float(self.space[i, j] + self.time[i, j])

    def peak(self, key: Key, *, lowest: bool = False) -> Peak:
        """Return the highest (or lowest) value over time with the band that the series' own band leaves to it."""
        value, band = self.series(key)
        sign = -1.0 if lowest else 1.0
        v = sign * value
        i = int(np.argmax(v))
        if not np.all(np.isfinite(band)):
            return Peak(float(value[i]), np.inf, float(self.grid.t[i]), float(self.grid.t[0]), float(self.grid.t[-1]))
        high, low = float(np.max(v + band)), float(np.max(v - band))
        possible = self.grid.t[v + band >= low]
        wide = max(high - v[i], v[i] - low)
        return Peak(float(value[i]), float(wide), float(self.grid.t[i]), float(possible[0]), float(possible[-1]))
