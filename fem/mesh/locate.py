"""Where points lie in a mesh: one sparse matrix that reads nodal temperatures at given points."""

from weakref import WeakKeyDictionary

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from fem.errors import MeshError
from fem.mesh.make import Mesh

Floats = NDArray[np.float64]

OUTSIDE = 1e-3
"""A point may lie this part of a cell's size outside the mesh (chords of arcs, rounding) and is then read at the nearest cell's edge."""


_KNOWN: WeakKeyDictionary[Mesh, dict[bytes, sp.csr_array]] = (
    WeakKeyDictionary()
)  # a run and its checks ask for the same points


def interpolation(mesh: Mesh, points: Floats) -> sp.csr_array:
    """Return the matrix (n, N) that interpolates nodal values linearly at points (n, 2) [m].

    Raises
    ------
    MeshError
        If a point lies outside the mesh by more than the sagitta of the arcs or rounding.
    """
    points = np.asarray(points, dtype=np.float64).reshape(-1, 2)
    known = _KNOWN.setdefault(mesh, {})
    if points.tobytes() not in known:
        known[points.tobytes()] = _interpolation(mesh, points)
    return known[points.tobytes()]


def _interpolation(mesh: Mesh, points: Floats) -> sp.csr_array:
    if not len(points):
        return sp.csr_array((0, len(mesh.points)))
    cells, weights, fits = _locate(mesh, points)
    if not fits.all():
        x, y = points[np.flatnonzero(~fits)[0]]
        raise MeshError(f"point ({x:.6g}, {y:.6g}) m lies outside the section")
    clipped = np.clip(weights, 0.0, None)
    clipped /= clipped.sum(axis=1, keepdims=True)
    rows = np.repeat(np.arange(len(points)), 3)
    return sp.csr_array((clipped.ravel(), (rows, mesh.cells[cells].ravel())), shape=(len(points), len(mesh.points)))


def _locate(mesh: Mesh, points: Floats) -> tuple[NDArray[np.intp], Floats, NDArray[np.bool_]]:
    """Return the best cell of each point (n,), its barycentric coordinates there (n, 3), and whether it may be read there (n,)."""
    corners = mesh.points[mesh.cells]
    tree = cKDTree(corners.mean(axis=1))
    reach = float(np.max(np.linalg.norm(corners - corners.mean(axis=1)[:, None, :], axis=2)))
    cells, weights, fits = [], [], []
    for point in points:
        near = np.array(tree.query_ball_point(point, 1.01 * reach + tree.query(point)[0]))
        coordinates = barycentric(corners[near], point)
        best = int(np.argmax(coordinates.min(axis=1)))
        cells.append(near[best])
        weights.append(coordinates[best])
        fits.append(coordinates[best].min() >= -_allowed(mesh, near[best]))
    return np.array(cells, dtype=np.intp), np.array(weights), np.array(fits, dtype=bool)


def barycentric(corners: Floats, point: Floats) -> Floats:
    """Return the barycentric coordinates (m, 3) of one point in triangles (m, 3, 2)."""
    a, b, c = corners[:, 0], corners[:, 1], corners[:, 2]
    area = _cross(b - a, c - a)
    first = _cross(b - point, c - point) / area
    second = _cross(c - point, a - point) / area
    return np.column_stack((first, second, 1.0 - first - second))


def _cross(u: Floats, v: Floats) -> Floats:
    return np.asarray(u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])


def _allowed(mesh: Mesh, cell: int) -> float:
    """Return how negative a barycentric coordinate may be: rounding, or the sagitta where the cell touches an arc."""
    arcs = [i for i, curve in enumerate(mesh.plan.curves) if curve.kind == "arc"]
    on_arc = np.isin(mesh.facets[np.isin(mesh.curve, arcs)], mesh.cells[cell]).all(axis=1).any()
    return 0.2 if on_arc else OUTSIDE
