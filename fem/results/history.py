"""What a run recorded: series over time that can be read at any instant, between steps too. Reading never solves."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

TEMPERATURES = ("gauge", "highest", "lowest", "mean")


@dataclass(frozen=True, order=True)
class Key:
    """Which series: a kind and the name of a gauge, region or exposure.

    Attributes
    ----------
    kind : str
        ``gauge`` [K]; ``highest``, ``lowest``, ``mean`` of a region [K]; ``flow`` [W] and ``heat`` [J] in through an exposure;
        ``made`` [J] in a region; ``stored`` [J] since the start. W and J are per metre of depth in a planar section.
    name : str
        ``""`` for the whole section.
    """

    kind: str
    name: str


@dataclass(frozen=True)
class History:
    """Series over the accepted steps.

    Attributes
    ----------
    keys : tuple of Key
        One per row.
    t0, t1 : (n,) float
        Start and end of each step, s.
    v0, v1 : (n_keys, n) float
        Values right after t0 and right before t1.
    d0, d1 : (n_keys, n) float
        Rates of change there, per s; `d0` is NaN where the rate right after a jump need not be finite. For a ``flow`` row `d0` holds
        the mean over the step instead, for a ``heat`` or ``made`` row the flows are the rates.
    """

    keys: tuple[Key, ...]
    t0: Floats
    t1: Floats
    v0: Floats
    v1: Floats
    d0: Floats
    d1: Floats

    def row(self, key: Key) -> int:
        """Return the row of a series.

        Raises
        ------
        KeyError
            If it was not recorded.
        """
        try:
            return self.keys.index(key)
        except ValueError:
            raise KeyError(key) from None

    def find(self, t: Floats, side: NDArray[np.int_]) -> NDArray[np.intp]:
        """Return the step that holds each instant; on a step's end, side -1 means the step before, +1 the one after."""
        before = np.searchsorted(self.t1, t, side="left")
        after = np.searchsorted(self.t0, t, side="right") - 1
        return np.clip(np.where(side < 0, before, after), 0, len(self.t0) - 1).astype(np.intp)

    def sample(self, t: Floats, side: NDArray[np.int_] | None = None) -> Floats:
        """Return all series at instants t [s], shape (n_keys, len(t)).

        Temperatures and stored heat: cubic Hermite (quadratic where the rate at the step's start is not known). Flows: the quadratic
        that keeps both ends and the step's heat.
        """
        t = np.atleast_1d(np.asarray(t, dtype=np.float64))
        step = self.find(t, -np.ones(len(t), dtype=int) if side is None else side)
        size = self.t1[step] - self.t0[step]
        s = np.clip((t - self.t0[step]) / size, 0.0, 1.0)
        v0, v1, d0, d1 = (a[:, step] for a in (self.v0, self.v1, self.d0, self.d1))
        smooth = hermite(s, v0, v1, d0 * size, d1 * size)
        flow = np.array([key.kind == "flow" for key in self.keys])
        if flow.any():
            smooth[flow] = balanced(s, v0[flow], v1[flow], d0[flow])
        return smooth


def hermite(s: Floats, v0: Floats, v1: Floats, d0: Floats, d1: Floats) -> Floats:
    """Return the cubic through both ends with both slopes, at s in [0, 1]; the quadratic with the end's slope where d0 is NaN."""
    d0 = np.where(np.isnan(d0), 2.0 * (v1 - v0) - d1, d0)
    h = s * s * (3.0 - 2.0 * s)
    return np.asarray(v0 + (v1 - v0) * h + s * (1.0 - s) * (d0 * (1.0 - s) - d1 * s))


def balanced(s: Floats, v0: Floats, v1: Floats, mean: Floats) -> Floats:
    """Return the quadratic through both ends with the given mean; the line with that mean and end where v0 is NaN."""
    v0 = np.where(np.isnan(v0), 2.0 * mean - v1, v0)
    return np.asarray(v0 + (v1 - v0) * s + 6.0 * (mean - 0.5 * (v0 + v1)) * s * (1.0 - s))
