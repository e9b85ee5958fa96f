"""Whether the cells beside an arc survive refinement, which moves the middles of chords out onto the arc."""

import numpy as np
from numpy.typing import NDArray

from fem.mesh.data import Floats, Ints, Mesh

CORNER_ROOM = 0.5 - 1e-6
"""Least area of a child at a cell's corner over a quarter of its parent's. Red refinement divides the ratio of rise to height
beside a chord by twice this, so that nothing gets worse from 1/2 on; below, each refinement is worse than the last. It is 1/2,
and a little more, at the node of a cusp, however short the chords: there the arc in a chord's middle is half as high as it."""
MIDDLE_ROOM = 0.2
"""The same of the child in the middle, which has no chord and so hands nothing on; common practice, no source."""


def cramped(mesh: Mesh) -> NDArray[np.bool_]:
    """Return the facets on arcs (F,) that are too long: refinement would crush a child beside them."""
    n = len(mesh.points)
    z = np.asarray(mesh.points[:, 0] + 1j * mesh.points[:, 1], dtype=np.complex128)
    middle = 0.5 * (z[mesh.facets[:, 0]] + z[mesh.facets[:, 1]])
    move = _onto_arc(mesh, middle) - middle
    facet_key = np.sort(mesh.facets, axis=1) @ np.array([n, 1])
    order = np.argsort(facet_key)
    pairs = np.sort(np.stack((mesh.cells, np.roll(mesh.cells, -1, axis=1)), axis=2), axis=2)
    key = pairs[:, :, 0] * n + pairs[:, :, 1]
    at = np.minimum(np.searchsorted(facet_key, key, sorter=order), len(order) - 1)
    facet: Ints = np.where(facet_key[order[at]] == key, order[at], -1)  # (M, 3): the facet on each side of a cell
    shift = np.where(facet >= 0, move[facet], 0.0)
    crushed = (shift != 0.0).any(axis=1)
    cells = np.flatnonzero(crushed)
    crushed[cells] = _crushed(z[mesh.cells[cells]], shift[cells])
    long = np.zeros(len(mesh.facets), dtype=bool)
    beside = facet[crushed]
    long[beside[beside >= 0]] = True
    return np.asarray(long & (move != 0.0))


def _onto_arc(mesh: Mesh, z: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """Return the points of facets, moved radially onto their arcs."""
    on = z.copy()
    for i, curve in enumerate(mesh.plan.curves):
        if curve.edge.centre is not None:
            mine = mesh.curve == i
            spoke = z[mine] - curve.edge.centre
            on[mine] = curve.edge.centre + curve.radius * spoke / np.abs(spoke)
    return on


def _crushed(corner: NDArray[np.complex128], shift: NDArray[np.complex128]) -> NDArray[np.bool_]:
    """Return which cells (k, 3), the middles of whose sides are shifted, would have a child with too little area."""
    middle = 0.5 * (corner + np.roll(corner, -1, axis=1)) + shift
    quarter = 0.25 * _area(corner)
    at_corners = np.array([_area(np.column_stack((corner[:, i], middle[:, i], middle[:, i - 1]))) for i in range(3)])
    tight = at_corners.min(axis=0) < CORNER_ROOM * quarter
    return np.asarray(tight | (_area(middle) < MIDDLE_ROOM * quarter))


def _area(corner: NDArray[np.complex128]) -> Floats:
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    return np.asarray(0.5 * (u.real * v.imag - u.imag * v.real))
