"""How well shaped the cells of a mesh are."""

from dataclasses import dataclass

import numpy as np

from fem.mesh.data import Floats, Mesh

ROUNDING = 1e-9
"""rad; right angles are not obtuse."""


@dataclass(frozen=True)
class Quality:
    """Facts on the shape of the cells.

    Attributes
    ----------
    smallest_angle, largest_angle : float
        rad.
    least_ratio, mean_ratio : float
        Twice the inscribed over the circumscribed radius: 1 for an equilateral cell, 0 for a flat one.
    obtuse_facing : float
        Part of the facets that see an angle of more than 90 degrees in a cell beside them: these couple their two nodes
        with the wrong sign, whatever lies beyond the facet.
    not_delaunay : float
        Part of the other edges whose two opposite angles add up to more than 180 degrees: the same within one stock.
    """

    smallest_angle: float
    largest_angle: float
    least_ratio: float
    mean_ratio: float
    obtuse_facing: float
    not_delaunay: float


def quality(mesh: Mesh) -> Quality:
    """Return the facts of a mesh."""
    p = mesh.points[mesh.cells]
    side = np.linalg.norm(np.roll(p, -1, axis=1) - np.roll(p, 1, axis=1), axis=2)  # (M, 3), opposite of each corner
    b, c = np.roll(side, 1, axis=1), np.roll(side, 2, axis=1)
    angle = np.arccos(np.clip((b**2 + c**2 - side**2) / (2.0 * b * c), -1.0, 1.0))
    ratio = 8.0 * np.prod(np.sin(0.5 * angle), axis=1)  # 2 r / R = 8 sin(A/2) sin(B/2) sin(C/2), a textbook identity
    facing, summed = _facing(mesh, angle)
    return Quality(
        float(angle.min()),
        float(angle.max()),
        float(ratio.min()),
        float(ratio.mean()),
        float(np.mean(facing > 0.5 * np.pi + ROUNDING)),
        float(np.mean(summed > np.pi + ROUNDING)) if len(summed) else 0.0,
    )


def _facing(mesh: Mesh, angle: Floats) -> tuple[Floats, Floats]:
    """Return the largest angle that faces each facet (F,), and the sum of the two that face each other edge."""
    n = len(mesh.points)
    ends = np.sort(np.stack((np.roll(mesh.cells, -1, axis=1), np.roll(mesh.cells, 1, axis=1)), axis=2), axis=2)
    key, edge = np.unique(ends[:, :, 0] * n + ends[:, :, 1], return_inverse=True)
    largest, total = np.zeros(len(key)), np.zeros(len(key))
    np.maximum.at(largest, edge.ravel(), angle.ravel())
    np.add.at(total, edge.ravel(), angle.ravel())
    on_facet = np.searchsorted(key, np.sort(mesh.facets, axis=1) @ np.array([n, 1]))
    inner = np.ones(len(key), dtype=bool)
    inner[on_facet] = False
    return largest[on_facet], total[inner]
