"""Every series with its band on one grid, and the figures read off them: peaks, values at an instant. Reading never solves."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from fem.results.bands import Grid
from fem.results.history import Key

Floats = NDArray[np.float64]

FINER = 8
"""Instants between two of the grid at which crossings, peaks and holds are looked for."""


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

    def dense(self, key: Key) -> tuple[Floats, Floats, Floats]:
        """Return instants, value and band of one series, also between the instants of the grid; (m,) each.

        Between them runs the monotone cubic of each stretch between jumps (Fritsch and Carlson, SIAM J. Numer. Anal. 17, 1980), which makes
        no peak of its own at a kink; half of what it differs from the straight line by goes into the band, so that a crossing between
        instants is banded too.
        """
        value, band = self.series(key)
        t = self.grid.t
        edges = [0, *(np.flatnonzero(np.diff(t) <= 0.0) + 1).tolist(), len(t)]
        parts = [_between(t[a:b], value[a:b], band[a:b]) for a, b in pairwise(edges)]
        return tuple(np.concatenate([part[i] for part in parts]) for i in range(3))  # type: ignore[return-value]

    def peak(self, key: Key, *, lowest: bool = False) -> Peak:
        """Return the highest (or lowest) value over time with the band that the series' own band leaves to it."""
        t, (value, band) = self.grid.t, self.series(key)
        sign = -1.0 if lowest else 1.0
        v = sign * value
        i = int(np.argmax(v))
        if not np.all(np.isfinite(band)):
            return Peak(float(value[i]), np.inf, float(t[i]), float(t[0]), float(t[-1]))
        high, low = float(np.max(v + band)), float(np.max(v - band))
        possible = t[v + band >= low]
        wide = max(high - v[i], v[i] - low)
        return Peak(float(value[i]), float(wide), float(t[i]), float(possible[0]), float(possible[-1]))


def _between(t: Floats, v: Floats, b: Floats) -> tuple[Floats, Floats, Floats]:
    """Return a smooth stretch of a series on `FINER` times as many instants, its own among them."""
    if len(t) < 3 or not np.all(np.isfinite(v)):
        return t, v, b
    inner = (t[:-1, None] + np.diff(t)[:, None] * np.arange(FINER) / FINER).ravel()
    fine = np.append(inner, t[-1])
    value = np.asarray(PchipInterpolator(t, v)(fine), dtype=np.float64)
    value[::FINER] = v
    if not np.all(np.isfinite(b)):
        return fine, value, np.full(len(fine), np.inf)
    return fine, value, np.interp(fine, t, b) + 0.5 * np.abs(value - np.interp(fine, t, v))
