"""Finer meshes of the same plan: every cell split, or marked ones; names kept, new nodes of arcs on the true circle.

Uniform: red refinement (Bank, Sherman & Weiser, Refinement algorithms and data structures for regular local mesh
refinement, 1983). Local: red-green-blue refinement of scikit-fem, which always halves a longest edge (Carstensen, An
adaptive mesh-refining algorithm allowing for an H1 stable L2 projection, Constr. Approx. 20, 2004) and so keeps angles
bounded.
"""

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.spatial import cKDTree
from skfem import MeshTri

from fem.mesh.arc_room import cramped
from fem.mesh.data import Floats, Ints, Mesh
from fem.mesh.verify import verify


def uniform(mesh: Mesh) -> tuple[Mesh, sp.csr_array]:
    """Return the mesh with every cell split into four, and the matrix that carries nodal values to it.

    Parameters
    ----------
    mesh : Mesh
        With N nodes and M cells.

    Returns
    -------
    finer : Mesh
        Nodes 0 to N - 1 are the old ones. The children of cell i are i, i + M, i + 2 M (at its corners 0, 1, 2) and
        i + 3 M (in its middle).
    prolongation : sparse (N_finer, N)
        Old nodes keep their value, a new one gets the mean of the two ends of its edge.

    Raises
    ------
    MeshError
        If moving nodes onto an arc turns a cell inside out: the mesh was too coarse for the arc.
    """
    n = len(mesh.points)
    ends, of_cell = _edges(mesh.cells, n)
    points = np.vstack((mesh.points, 0.5 * (mesh.points[ends[:, 0]] + mesh.points[ends[:, 1]])))
    a, b, c = mesh.cells.T
    ab, bc, ca = (of_cell + n).T
    cells = np.concatenate([np.column_stack(child) for child in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))])
    between = n + _find(ends, mesh.facets, n)
    _onto_arcs(points, mesh, between, np.ones(len(between), dtype=bool))
    facets = np.concatenate(
        (np.column_stack((mesh.facets[:, 0], between)), np.column_stack((between, mesh.facets[:, 1])))
    )
    finer = Mesh(points, cells, np.tile(mesh.region, 4), facets, np.tile(mesh.curve, 2), mesh.plan)
    verify(finer)
    half = sp.csr_array(
        (np.full(2 * len(ends), 0.5), ends.ravel(), np.arange(0, 2 * len(ends) + 1, 2)), shape=(len(ends), n)
    )
    return finer, sp.csr_array(sp.vstack((sp.eye_array(n, format="csr"), half), format="csr"))


def local(mesh: Mesh, marked: NDArray[np.bool_]) -> tuple[Mesh, Ints]:
    """Return the mesh with the marked cells split into four, and neighbours split so that no node hangs.

    Parameters
    ----------
    mesh : Mesh
        With N nodes and M cells.
    marked : (M,) bool

    Returns
    -------
    finer : Mesh
        Nodes 0 to N - 1 are the old ones.
    parent : (M_finer,) int
        Old cell that each new one is a part of.

    Raises
    ------
    MeshError
        If moving nodes onto an arc turns a cell inside out.
    """
    marked = np.asarray(marked, dtype=bool).copy()
    while True:
        finer, parent = _split(mesh, marked)
        cells = np.isin(np.sort(finer.cells, axis=1), finer.facets[cramped(finer)]).sum(axis=1) > 1
        more = parent[cells]
        if marked[more].all():
            break
        marked[more] = True  # a neighbour that was halved over a whole chord is split in four instead
    verify(finer)
    return finer, parent


def _split(mesh: Mesh, marked: NDArray[np.bool_]) -> tuple[Mesh, Ints]:
    """Return the mesh with marked cells split, and the parents, before anything is verified."""
    n = len(mesh.points)
    split = MeshTri(mesh.points.T.copy(), mesh.cells.T.copy()).with_subdomains(_bits(len(mesh.cells)))
    split = split.refined(np.flatnonzero(marked))
    parent = np.zeros(split.t.shape[1], dtype=np.int64)
    for bit, members in split.subdomains.items():
        parent[members] += 1 << int(bit)
    points, cells = split.p.T.copy(), split.t.T.astype(np.int64)
    corner = points[cells]
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    clockwise = u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0] < 0.0  # scikit-fem sorts the nodes of a cell
    cells[clockwise] = cells[clockwise, ::-1]
    facets, curve = _split_facets(mesh, points, n)
    return Mesh(points, cells, mesh.region[parent], facets, curve, mesh.plan), parent


def _bits(count: int) -> dict[str, NDArray[np.int64]]:
    """Return the cells whose number has bit k set, for every k: scikit-fem hands down sets of cells, but no parents."""
    numbers = np.arange(count)
    return {str(k): np.flatnonzero(numbers >> k & 1) for k in range(max(1, count - 1).bit_length())}


def _split_facets(mesh: Mesh, points: Floats, n: int) -> tuple[Ints, Ints]:
    """Return the facets with those in two halves that got a node in their middle, which is put on its arc."""
    ends = mesh.points[mesh.facets]
    middle = 0.5 * (ends[:, 0] + ends[:, 1])
    if len(points) == n:
        return mesh.facets, mesh.curve
    gap, nearest = cKDTree(points[n:]).query(middle)
    halved = gap <= 1e-9 * mesh.facet_lengths
    between = n + np.asarray(nearest, dtype=np.int64)
    _onto_arcs(points, mesh, between, halved)
    first = np.column_stack((mesh.facets[:, 0], np.where(halved, between, mesh.facets[:, 1])))
    second = np.column_stack((between, mesh.facets[:, 1]))[halved]
    return np.concatenate((first, second)), np.concatenate((mesh.curve, mesh.curve[halved]))


def _edges(cells: Ints, n: int) -> tuple[Ints, Ints]:
    """Return the ends (E, 2) of all edges, and for each cell its three edges: from corner 0 to 1, 1 to 2, 2 to 0."""
    pairs = np.sort(np.stack((cells, np.roll(cells, -1, axis=1)), axis=2), axis=2)
    key, of_cell = np.unique(pairs[:, :, 0] * n + pairs[:, :, 1], return_inverse=True)
    return np.column_stack((key // n, key % n)), of_cell.reshape(-1, 3)


def _find(ends: Ints, facets: Ints, n: int) -> Ints:
    """Return the number of the edge that each facet is; edges come sorted."""
    wanted = np.sort(facets, axis=1)
    return np.asarray(np.searchsorted(ends[:, 0] * n + ends[:, 1], wanted[:, 0] * n + wanted[:, 1]), dtype=np.int64)


def _onto_arcs(points: Floats, mesh: Mesh, between: Ints, new: NDArray[np.bool_]) -> None:
    """Move the new middle nodes of facets radially onto the circle of their arc, in place."""
    for i, curve in enumerate(mesh.plan.curves):
        if curve.centre is not None:
            nodes = between[(mesh.curve == i) & new]
            spoke = points[nodes] - curve.centre
            points[nodes] = curve.centre + curve.radius * spoke / np.linalg.norm(spoke, axis=1, keepdims=True)
