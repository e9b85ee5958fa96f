"""A plan drawn in gmsh, and the mesh read back entity by entity.

pygmsh's own conversion shifts the tags of triangles when curves and surfaces are both tagged (7.1.17 with gmsh 4.15):
nothing here uses it.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.errors import MeshError
from fem.mesh.gmsh_session import Gmsh
from fem.mesh.size import SizeField
from fem.section.edge import Complexes, Edge, Floats, winding
from fem.section.plan import Plan

Ints = NDArray[np.int64]

ON_CURVE = 1e-6
"""A gauge nearer to a curve than this part of the section's size lies on it."""
CLEAR = 0.5
"""Cell sizes that a gauge keeps from ends of curves, from other gauges and (unless it is on one) from curves; one that
does not becomes no node."""
FRONTAL_DELAUNAY = 6


@dataclass(frozen=True)
class Drawn:
    """What was drawn, by gmsh's tags.

    Attributes
    ----------
    points : dict
        Exact place of each point tag, m.
    facets : (F, 2) int
        Point tags of each chord.
    curve : (F,) int
        Curve of each chord.
    surfaces : list of int
        Surface tag of each face.
    """

    points: dict[int, complex]
    facets: Ints
    curve: Ints
    surfaces: list[int]


@dataclass(frozen=True)
class Raw:
    """A mesh as gmsh numbers it: points, cells with their face, facets (along their curve) with their curve."""

    z: Complexes
    cells: Ints
    face: Ints
    facets: Ints
    curve: Ints


class Gauged:
    """The gauges that become nodes: fractions along curves at which to split them, and points inside faces."""

    def __init__(self, plan: Plan, sizes: SizeField, gauges: Complexes) -> None:
        self.on: list[list[float]] = [[] for _ in plan.curves]
        self.inside: list[list[complex]] = [[] for _ in plan.faces]
        taken: list[complex] = [complex(z) for z in sizes.nodes]
        for z in gauges:
            distance = np.array([curve.edge.distance(np.array([z]))[0] for curve in plan.curves])
            nearest, clear = int(np.argmin(distance)), CLEAR * sizes.at(complex(z))
            if min(abs(z - other) for other in taken) <= clear:
                continue
            if distance[nearest] <= ON_CURVE * plan.size:
                self.on[nearest].append(float(plan.curves[nearest].edge.fraction(np.array([z]))[0]))
                taken.append(complex(z))
            elif distance[nearest] > clear:
                self._inside(plan, complex(z), taken)

    def _inside(self, plan: Plan, z: complex, taken: list[complex]) -> None:
        for k, face in enumerate(plan.faces):
            loops = [[_edge(plan, half) for half in loop] for loop in face.loops]
            if winding(loops[0], np.array([z]))[0] and not any(winding(loop, np.array([z]))[0] for loop in loops[1:]):
                self.inside[k].append(z)
                taken.append(z)


def _edge(plan: Plan, half: tuple[int, bool]) -> Edge:
    return plan.curves[half[0]].edge if half[1] else plan.curves[half[0]].edge.reversed()


class Drawer:
    """Draws in a frame in which the section has the size 1, since gmsh's tolerances are absolute.

    Curves are drawn as the chords between their nodes, which thus lie on lines and arcs exactly; gmsh fills the faces.
    """

    def __init__(self, gmsh: Gmsh, plan: Plan, sizes: SizeField) -> None:
        self._geometry, self._gmsh, self._plan, self._sizes = gmsh.geometry, gmsh.api, plan, sizes
        # In a body of revolution the axis stays at x = 0 exactly.
        x = 0.0 if plan.kind == "revolution" else float(sizes.nodes.real.min())
        self._origin = complex(x, float(sizes.nodes.imag.min()))
        self._points: dict[complex, Any] = {}

    def _point(self, z: complex) -> Any:
        if z not in self._points:
            w = (z - self._origin) / self._plan.size
            self._points[z] = self._geometry.add_point([w.real, w.imag, 0.0])
        return self._points[z]

    def draw(self, fractions: Sequence[Floats], inside: Sequence[Sequence[complex]]) -> Drawn:
        """Draw all curves as chords between nodes at fractions, and all faces with the given points inside."""
        chords, facets = [], []
        for curve, f in zip(self._plan.curves, fractions, strict=True):
            points = [self._point(complex(z)) for z in curve.edge.at(f)]
            chords.append([self._geometry.add_line(a, b)._id for a, b in pairwise(points)])
            facets += [(a._id, b._id) for a, b in pairwise(points)]
        curve_of = np.repeat(np.arange(len(chords)), [len(part) for part in chords])
        surfaces = [self._surface(face.loops, chords) for face in self._plan.faces]
        embedded = [
            (self._point(z)._id, surface) for surface, points in zip(surfaces, inside, strict=True) for z in points
        ]
        self._geometry.synchronize()
        for chord in (chord for part in chords for chord in part):
            self._gmsh.model.mesh.setTransfiniteCurve(chord, 2)
        for point, surface in embedded:
            self._gmsh.model.mesh.embed(0, [point], 2, surface)
        exact = {point._id: z for z, point in self._points.items()}
        return Drawn(exact, np.array(facets), curve_of, surfaces)

    def _surface(self, loops: Sequence[Sequence[tuple[int, bool]]], chords: Sequence[Sequence[int]]) -> int:
        """Return the tag of a face (pygmsh would copy every line that is run backwards)."""
        geo = self._geometry.env
        walks = [
            [tag for i, forward in loop for tag in (chords[i] if forward else [-t for t in reversed(chords[i])])]
            for loop in loops
        ]
        return int(geo.addPlaneSurface([geo.addCurveLoop(walk) for walk in walks]))

    def generate(self) -> None:
        """Let gmsh mesh what was drawn."""
        scale, origin, at = self._plan.size, self._origin, self._sizes.at
        failed: list[BaseException] = []

        def size(_dim: int, _tag: int, x: float, y: float, _z: float, _lc: float) -> float:
            try:
                return at(origin + scale * complex(x, y)) / scale
            except BaseException as error:  # noqa: BLE001 - through C nothing can be raised, not even Ctrl-C: raised below
                failed.append(error)
                return 1.0  # the size of the section: be done soon

        self._geometry.set_mesh_size_callback(size, ignore_other_mesh_sizes=True)
        self._gmsh.option.setNumber("Mesh.Algorithm", FRONTAL_DELAUNAY)
        self._gmsh.model.mesh.generate(2)
        if failed:
            raise failed[0]

    def read(self, drawn: Drawn) -> Raw:
        """Return what gmsh made, entity by entity."""
        mesh = self._gmsh.model.mesh
        tags, xyz, _ = mesh.getNodes()
        index = np.zeros(int(tags.max()) + 1, dtype=np.int64)
        index[tags] = np.arange(len(tags))
        z = self._origin + self._plan.size * (xyz[0::3] + 1j * xyz[1::3])
        node_of = {}
        for point, exact in drawn.points.items():
            at, _, _ = mesh.getNodes(0, point)
            node_of[point] = int(index[at[0]])
            z[node_of[point]] = exact
        facets = np.array([(node_of[a], node_of[b]) for a, b in drawn.facets.tolist()])
        cells = [index[self._corners(k, surface)].reshape(-1, 3) for k, surface in enumerate(drawn.surfaces)]
        face = np.repeat(np.arange(len(cells)), [len(part) for part in cells])
        return Raw(z, np.concatenate(cells), face, facets, drawn.curve)

    def _corners(self, face: int, surface: int) -> NDArray[np.int64]:
        """Return the node tags of the triangles of a surface, three each."""
        kinds, _, nodes = self._gmsh.model.mesh.getElements(2, surface)
        if not len(kinds):
            name = self._plan.region_names[self._plan.faces[face].region]
            raise MeshError(
                f'gmsh did not fill a part of region "{name}"; it said: {self._gmsh.logger.getLastError() or "nothing"}'
            )
        return np.asarray(np.concatenate(nodes), dtype=np.int64)
