"""Whether a mesh agrees with its plan: every cell's region and every facet's curve, by area, length and neighbours."""

import numpy as np
from numpy.typing import NDArray

from fem.errors import MeshError
from fem.mesh.data import Floats, Mesh

AGREES = 1e-9
"""Relative: far above float64 rounding of sums over cells, far below what one misplaced cell would make."""


def verify(mesh: Mesh) -> None:
    """Compare a mesh with its plan.

    Raises
    ------
    MeshError
        With the number that disagrees.
    """
    _check_cells(mesh)
    _check_curves(mesh)
    _check_areas(mesh)
    _check_sides(mesh)


def bows(mesh: Mesh) -> Floats:
    """Return the area between each facet and its arc, m2, (F,): positive when it belongs to the curve's left side."""
    radius = np.array([curve.radius for curve in mesh.plan.curves])[mesh.curve]
    turn = np.sign([curve.edge.sweep for curve in mesh.plan.curves])[mesh.curve]
    angle = _angles(mesh, radius)
    return np.asarray(turn * 0.5 * radius**2 * (angle - np.sin(angle)))


def _angles(mesh: Mesh, radius: Floats) -> Floats:
    """Return the angle of arc over each facet, rad; 0 on a line."""
    arc = radius > 0.0
    ratio = np.zeros(len(radius))
    ratio[arc] = mesh.facet_lengths[arc] / (2.0 * radius[arc])
    return np.asarray(2.0 * np.arcsin(np.clip(ratio, 0.0, 1.0)))


def _check_cells(mesh: Mesh) -> None:
    regions = len(mesh.plan.region_names)
    if len(mesh.region) != len(mesh.cells) or mesh.region.min(initial=0) < 0 or mesh.region.max(initial=0) >= regions:
        raise MeshError(f"the mesh has {len(mesh.cells)} cells, of which not each has one of {regions} regions")
    worst = int(np.argmin(mesh.areas))
    if mesh.areas[worst] <= 0.0:
        x, y = mesh.points[mesh.cells[worst]].mean(axis=0)
        raise MeshError(
            f"cell {worst} at x = {x:.6g} m, y = {y:.6g} m is inverted: its area is {mesh.areas[worst]:.3g} m2"
        )
    used = np.bincount(mesh.cells.ravel(), minlength=len(mesh.points))
    if used.min() == 0:
        raise MeshError(f"{np.count_nonzero(used == 0)} nodes belong to no cell")


def _check_curves(mesh: Mesh) -> None:
    """Compare each curve's length with that of the arcs over its facets, and see that the facets' ends lie on it."""
    curves = mesh.plan.curves
    if len(mesh.curve) != len(mesh.facets) or mesh.curve.min(initial=0) < 0 or mesh.curve.max(initial=0) >= len(curves):
        raise MeshError(
            f"the mesh has {len(mesh.facets)} facets, of which not each lies on one of {len(curves)} curves"
        )
    radius = np.array([curve.radius for curve in curves])[mesh.curve]
    along = np.where(radius > 0.0, radius * _angles(mesh, radius), mesh.facet_lengths)
    total = np.bincount(mesh.curve, weights=along, minlength=len(curves))
    for i, curve in enumerate(curves):
        if abs(total[i] - curve.length) > AGREES * curve.length:
            names = ", ".join(sorted(curve.labels))
            raise MeshError(
                f"the curve {names} is {curve.length:.12g} m long in the section and {total[i]:.12g} m in the mesh"
            )
        nodes = mesh.points[mesh.facets[mesh.curve == i].ravel()]
        off = curve.edge.distance(nodes[:, 0] + 1j * nodes[:, 1]).max()
        if off > AGREES * mesh.plan.size:
            raise MeshError(f"a node of the curve {', '.join(sorted(curve.labels))} lies {off:.3g} m off it")


def _check_areas(mesh: Mesh) -> None:
    """Compare each region's area with that of its cells and of the bows between chords and arcs."""
    plan, bow = mesh.plan, bows(mesh)
    total = np.bincount(mesh.region, weights=mesh.areas, minlength=len(plan.region_names))
    for i, curve in enumerate(plan.curves):
        if curve.kind == "arc":
            between = bow[mesh.curve == i].sum()
            for region, sign in ((curve.left, 1.0), (curve.right, -1.0)):
                if region >= 0:
                    total[region] += sign * between
    for name, exact, meshed in zip(plan.region_names, plan.region_area, total, strict=True):
        if abs(meshed - exact) > AGREES * exact:
            raise MeshError(f'region "{name}" has {exact:.12g} m2 in the section and {meshed:.12g} m2 in the mesh')


def _check_sides(mesh: Mesh) -> None:
    """See that beside each facet lie the regions of its curve, and that every change of region is on a facet."""
    n = len(mesh.points)
    start, end = mesh.cells.ravel(), np.roll(mesh.cells, -1, axis=1).ravel()
    order = np.argsort(start * n + end)
    key, owner = (start * n + end)[order], np.repeat(mesh.region, 3)[order]
    if (key[1:] == key[:-1]).any():
        raise MeshError("two cells of the mesh lie on each other")
    a, b = mesh.facets.T
    left, right = _owner(key, owner, a * n + b), _owner(key, owner, b * n + a)
    wanted = np.array([(curve.left, curve.right) for curve in mesh.plan.curves])[mesh.curve]
    wrong = np.flatnonzero((left != wanted[:, 0]) | (right != wanted[:, 1]))
    if len(wrong):
        names = ", ".join(sorted(mesh.plan.curves[mesh.curve[wrong[0]]].labels))
        raise MeshError(f"{len(wrong)} facets, the first one on {names}, do not lie between the regions of their curve")
    across = _owner(key, owner, (end * n + start)[order])
    changes = np.count_nonzero(across == -1) + np.count_nonzero((across != owner) & (across >= 0)) // 2
    if changes != len(mesh.facets):
        raise MeshError(
            f"the region changes across {changes} facets of the mesh, and {len(mesh.facets)} of them lie on curves"
        )


def _owner(key: NDArray[np.int64], owner: NDArray[np.int64], wanted: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return the region of the cell that has each directed facet, -1 where none has."""
    at = np.minimum(np.searchsorted(key, wanted), len(key) - 1)
    return np.asarray(np.where(key[at] == wanted, owner[at], -1))
