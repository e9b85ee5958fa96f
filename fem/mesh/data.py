"""A triangle mesh of a plan."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fem.section.plan import Plan

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Mesh:
    """Triangles that know their region, and facets that know their curve.

    Attributes
    ----------
    points : (N, 2) float
        m.
    cells : (M, 3) int
        Nodes of each triangle, counter-clockwise.
    region : (M,) int
        Region of each cell.
    facets : (F, 2) int
        Nodes of every facet that lies on a curve, in the direction of the curve.
    curve : (F,) int
        Index into ``plan.curves``.
    plan : Plan
    """

    points: Floats
    cells: Ints
    region: Ints
    facets: Ints
    curve: Ints
    plan: Plan

    @cached_property
    def areas(self) -> Floats:
        """Return signed areas of the cells in the section plane, m2, (M,)."""
        a, b, c = (self.points[self.cells[:, i]] for i in range(3))
        u, v = b - a, c - a
        return np.asarray(0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]))

    @cached_property
    def h(self) -> Floats:
        """Return the longest edge of each cell, m, (M,)."""
        p = self.points[self.cells]
        return np.asarray(np.linalg.norm(p - np.roll(p, 1, axis=1), axis=2).max(axis=1))

    @cached_property
    def facet_lengths(self) -> Floats:
        """Return the lengths of the facets, m, (F,)."""
        return np.asarray(np.linalg.norm(self.points[self.facets[:, 1]] - self.points[self.facets[:, 0]], axis=1))

    @cached_property
    def outer(self) -> NDArray[np.bool_]:
        """Return which facets have the outside or a void on one side, (F,)."""
        outside = np.array([curve.left < 0 or curve.right < 0 for curve in self.plan.curves], dtype=bool)
        return np.asarray(outside[self.curve])
