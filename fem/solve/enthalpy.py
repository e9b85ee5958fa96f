"""Volumetric enthalpy H(T) = integral of rho c dT: what the march conserves.

H and its slope come from one table, so that stored heat and the Newton matrix can never disagree.
"""

from typing import Protocol

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from fem.laws import Law

Floats = NDArray[np.float64]

ZERO = 273.15  # K, where H = 0; any value serves, this one keeps H small
STEP = 0.05  # K between table rows: a peak 3 K wide is resolved to better than 1e-4 of its height
FLOOR, CEILING = 1.0, 6000.0  # K; outside, the last slope goes on, so that a Newton iterate there still points back
MARGIN = 150.0  # K by which the table is extended past a temperature that it does not hold
GAUSS = 48


class Enthalpy(Protocol):
    """Enthalpy per volume of one region."""

    def heat(self, T: Floats, x: Floats, y: Floats) -> Floats:
        """Return H(T), J/m3."""

    def slope(self, T: Floats, x: Floats, y: Floats) -> Floats:
        """Return dH/dT, J/(m3 K)."""


class ConstantEnthalpy:
    """H = rho c (T - T0) with a constant rho c."""

    def __init__(self, rho_c: float) -> None:
        self.rho_c = rho_c

    def heat(self, T: Floats, x: Floats, y: Floats) -> Floats:  # noqa: ARG002
        """Return H(T), J/m3, in the shape of T."""
        return self.rho_c * (T - ZERO)

    def slope(self, T: Floats, x: Floats, y: Floats) -> Floats:  # noqa: ARG002
        """Return rho c, J/(m3 K), in the shape of T."""
        return np.full(np.shape(T), self.rho_c)


class TableEnthalpy:
    """H(T) integrated exactly over a piecewise linear rho c(T), tabulated where the march has been."""

    def __init__(self, law: Law) -> None:
        self._law = law
        self._first = self._last = 0
        self._extend(ZERO, ZERO + MARGIN)

    def _extend(self, low: float, high: float) -> None:
        low, high = max(low - MARGIN, FLOOR), min(high + MARGIN, CEILING)
        first = min(self._first, int(np.floor((low - ZERO) / STEP)))
        last = max(self._last, int(np.ceil((high - ZERO) / STEP)))
        T = ZERO + STEP * np.arange(first, last + 1)
        c = np.broadcast_to(np.asarray(self._law(T=T), dtype=np.float64), T.shape)
        H = np.concatenate(([0.0], np.cumsum(0.5 * STEP * (c[1:] + c[:-1]))))
        self._first, self._last = first, last
        self._H = H - H[-first]
        self._rise, self._bend = (
            STEP * c[:-1],
            0.5 * STEP * np.diff(c),
        )  # H = H0 + f (rise + bend f), f in [0, 1] from row to row

    def _locate(self, T: Floats) -> tuple[Floats, NDArray[np.intp], Floats]:
        """Return T brought into the table, its row and the fraction of the way to the next one."""
        low, high = float(np.min(T, initial=ZERO)), float(np.max(T, initial=ZERO))
        if (low - ZERO < STEP * self._first and low > FLOOR) or (high - ZERO > STEP * self._last and high < CEILING):
            self._extend(low, high)
        bottom, top = ZERO + STEP * self._first, ZERO + STEP * self._last
        inside = T if bottom < low and high < top else np.clip(T, bottom, top)
        s = (inside - bottom) / STEP
        row = np.minimum(s.astype(np.intp), len(self._rise) - 1)
        return inside, row, s - row

    def heat(self, T: Floats, x: Floats, y: Floats) -> Floats:  # noqa: ARG002
        """Return H(T), J/m3, in the shape of T."""
        inside, row, f = self._locate(T)
        rise, bend = self._rise[row], self._bend[row]
        H = self._H[row] + f * (rise + bend * f)
        return np.asarray(H if inside is T else H + (rise + 2.0 * bend * f) / STEP * (T - inside))

    def slope(self, T: Floats, x: Floats, y: Floats) -> Floats:  # noqa: ARG002
        """Return dH/dT, J/(m3 K), in the shape of T."""
        _, row, f = self._locate(T)
        return np.asarray((self._rise[row] + 2.0 * self._bend[row] * f) / STEP)


class PlacedEnthalpy:
    """H(T, x, y) for a rho c that also varies over the region: Gauss-Legendre quadrature from T0 to T at each node."""

    def __init__(self, law: Law) -> None:
        self._law = law
        points, weights = leggauss(GAUSS)
        self._points, self._weights = 0.5 * (points + 1.0), 0.5 * weights

    def heat(self, T: Floats, x: Floats, y: Floats) -> Floats:
        """Return H(T), J/m3, in the shape of T."""
        span = T - ZERO
        nodes = ZERO + self._points[:, None] * span
        c = np.broadcast_to(self._law(T=nodes, x=x[None, :], y=y[None, :]), nodes.shape)
        return np.asarray(span * (self._weights @ c))

    def slope(self, T: Floats, x: Floats, y: Floats) -> Floats:
        """Return dH/dT, J/(m3 K), in the shape of T."""
        return np.array(np.broadcast_to(self._law(T=T, x=x, y=y), np.shape(T)), dtype=np.float64)


def enthalpy(rho_c: Law) -> Enthalpy:
    """Return the enthalpy whose slope is the given law, J/(m3 K)."""
    if rho_c.constant:
        return ConstantEnthalpy(float(rho_c()))
    if rho_c.needs <= {"T"}:
        return TableEnthalpy(rho_c)
    return PlacedEnthalpy(rho_c)
