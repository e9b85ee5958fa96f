"""A plan drawn in gmsh, and the mesh read back entity by entity.

pygmsh's own conversion shifts the tags of triangles when curves and surfaces are both tagged (7.1.17 with gmsh 4.15): nothing here uses it.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.chords import clear_of_each_other
from fem.edge import Complexes, Edge, winding
from fem.errors import MeshError
from fem.gmsh_session import Gmsh
from fem.mesh_size import SizeField
from fem.section import Plan

Ints = NDArray[np.int64]

ON_CURVE = 1e-6
"""A gauge nearer to a curve than this part of the section's size lies on it."""
CLEAR = 0.5
"""A gauge becomes a node only if it keeps this many cell sizes from curves' ends, from other gauges and (unless it is on one) from curves."""
FRONTAL_DELAUNAY = 6


@dataclass(frozen=True)
class Drawn:
    """gmsh's tags of what was drawn: the exact place of each point tag, the two point tags of each chord and its curve, the faces' surfaces."""

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

    Curves are drawn as the chords between their nodes, which thus lie on lines and arcs exactly; gmsh fills the faces between them.
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

    def draw(self, gauged: Gauged) -> Drawn:
        """Draw all curves as chords, and all faces."""
        wanted = [self._sizes.divided(i, gauged.on[i]) for i in range(len(self._plan.curves))]
        fractions = clear_of_each_other(self._plan.curves, wanted)
        chords = [self._chords(curve.edge.at(f)) for curve, f in zip(self._plan.curves, fractions, strict=True)]
        facets = [(p.points[0]._id, p.points[1]._id) for part in chords for p in part]
        curve = np.repeat(np.arange(len(chords)), [len(part) for part in chords])
        surfaces, embedded = [], []
        for k, face in enumerate(self._plan.faces):
            loops = []
            for loop in face.loops:
                walk = [p for i, forward in loop for p in (chords[i] if forward else [-chord for chord in reversed(chords[i])])]
                loops.append(self._geometry.add_curve_loop(walk))
            surfaces.append(self._geometry.add_plane_surface(loops[0], loops[1:])._id)
            embedded += [(self._point(z)._id, surfaces[-1]) for z in gauged.inside[k]]
        self._geometry.synchronize()
        for part in chords:
            for chord in part:
                self._gmsh.model.mesh.setTransfiniteCurve(chord._id, 2)
        for point, surface in embedded:
            self._gmsh.model.mesh.embed(0, [point], 2, surface)
        exact = {point._id: z for z, point in self._points.items()}
        return Drawn(exact, np.array(facets), curve, surfaces)

    def _chords(self, z: Complexes) -> list[Any]:
        return [self._geometry.add_line(self._point(complex(a)), self._point(complex(b))) for a, b in zip(z[:-1], z[1:], strict=True)]

    def generate(self) -> None:
        """Let gmsh mesh what was drawn."""
        scale, origin, at = self._plan.size, self._origin, self._sizes.at

        def size(_dim: int, _tag: int, x: float, y: float, _z: float, _lc: float) -> float:
            return at(origin + scale * complex(x, y)) / scale

        self._geometry.set_mesh_size_callback(size, ignore_other_mesh_sizes=True)
        self._gmsh.option.setNumber("Mesh.Algorithm", FRONTAL_DELAUNAY)
        self._gmsh.model.mesh.generate(2)

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
            raise MeshError(f'gmsh did not fill a part of region "{name}"; its last message: {self._gmsh.logger.getLastError() or "none"}')
        return np.asarray(np.concatenate(nodes), dtype=np.int64)
