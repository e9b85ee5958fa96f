"""A plan -> a triangle mesh of it, graded by thickness and by arcs, and verified against the plan."""

from collections.abc import Sequence

import numpy as np

from fem.errors import MeshError
from fem.mesh.arc_room import cramped
from fem.mesh.chords import clear_of_each_other, halved
from fem.mesh.data import Floats, Ints, Mesh
from fem.mesh.draw import Drawer, Gauged, Raw
from fem.mesh.gmsh_session import gmsh_session
from fem.mesh.size import SizeField
from fem.mesh.verify import verify
from fem.section.edge import Complexes
from fem.section.plan import Plan

__all__ = ["Mesh", "make_mesh"]

ROUNDS = 12
"""Of halving chords of arcs that leave refinement no room; few sections need one."""


def make_mesh(plan: Plan, *, across: int = 4, finer: float = 1.0, gauges: Floats | None = None) -> Mesh:
    """Return a mesh with at least three cells across every part of the plan; any thread or process may call this.

    Parameters
    ----------
    plan : Plan
    across : int
        Cell sizes across each part, 3 or more.
    finer : float
        All cell sizes are divided by it.
    gauges : (n, 2) float, optional
        Points that become nodes, m. One that is too near to a curve, to the end of a curve or to another gauge for
        well-shaped cells is left out, and its value is then interpolated.

    Raises
    ------
    MeshError
        If gmsh gives up, or what it made does not agree with the plan.
    SystemLibraryMissing
        If a library that gmsh needs is not on this machine.
    """
    if across < 3 or not finer > 0.0:
        raise ValueError("across is 3 or more and finer is positive")
    sizes = SizeField(plan, across=across, finer=finer)
    points = np.zeros((0, 2)) if gauges is None else np.asarray(gauges, dtype=np.float64).reshape(-1, 2)
    gauged = Gauged(plan, sizes, points[:, 0] + 1j * points[:, 1])
    fractions = [sizes.divided(i, gauged.on[i]) for i in range(len(plan.curves))]
    for _ in range(ROUNDS):
        fractions = clear_of_each_other(plan.curves, fractions)
        mesh = _filled(plan, sizes, fractions, gauged.inside)
        long = cramped(mesh)
        if not long.any():
            verify(mesh)
            return mesh
        fractions = halved(fractions, long)
    x, y = mesh.points[mesh.facets[long][0]].mean(axis=0)
    raise MeshError(
        f"cells beside an arc at x = {x:.6g} m, y = {y:.6g} m would be crushed by refinement, however short its chords"
    )


def _filled(plan: Plan, sizes: SizeField, fractions: Sequence[Floats], inside: Sequence[Sequence[complex]]) -> Mesh:
    """Return the mesh with the given nodes on its curves."""
    with gmsh_session() as gmsh:
        drawer = Drawer(gmsh, plan, sizes)
        drawn = drawer.draw(fractions, inside)
        drawer.generate()
        raw = drawer.read(drawn)
    return _mesh(plan, raw)


def _mesh(plan: Plan, raw: Raw) -> Mesh:
    """Return the mesh in our form: no stray nodes, cells counter-clockwise."""
    if not len(raw.cells):
        raise MeshError("gmsh made no cells")
    used, compact = np.unique(raw.cells, return_inverse=True)
    cells: Ints = compact.reshape(-1, 3).astype(np.int64)
    z = raw.z[used]
    number = np.full(len(raw.z), -1)
    number[used] = np.arange(len(used))
    facets = number[raw.facets].astype(np.int64)
    if facets.min(initial=0) < 0:
        raise MeshError("a facet of a curve belongs to no cell")
    points = np.column_stack((z.real, z.imag))
    clockwise = _clockwise(z, cells)
    cells[clockwise] = cells[clockwise, ::-1]
    region = np.array([face.region for face in plan.faces], dtype=np.int64)[raw.face]
    return Mesh(points, cells, region, facets, raw.curve.astype(np.int64), plan)


def _clockwise(z: Complexes, cells: Ints) -> np.ndarray:
    u, v = z[cells[:, 1]] - z[cells[:, 0]], z[cells[:, 2]] - z[cells[:, 0]]
    return np.asarray(u.real * v.imag - u.imag * v.real < 0.0)
