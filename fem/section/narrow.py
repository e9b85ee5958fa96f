"""Places narrower than the gap tolerance: hair-thin parts of a face, and gaps between faces.

Found by an opening, in the sense of mathematical morphology (Serra, Image Analysis and Mathematical Morphology, 1982,
ch. II), with a disc as wide as the tolerance.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from fem.section.edge import Complexes, Floats
from fem.section.faces import Loop, sectors
from fem.section.partition import NOBODY, SAME_POINT, Link

SHARP = np.deg2rad(45.0)
"""In a corner sharper than this an opening takes away more than a rounding, though nothing is hair-thin."""
HAIR = np.deg2rad(0.5)
"""A corner of straight sides sharper than this is a hair, not a corner; common practice, no source."""
ROUNDING = 2.0
"""An opening rounds corners of `SHARP` and more over less than so many tolerances; what is longer is thin."""
FACING = -0.5
"""Two links face each other when the cosine between their inward normals is below this."""
MARGIN = 0.01
"""Of the tolerance; shapely's buffers are exact to about this part of their width."""
BETWEEN = 1e-3
"""A place lies between two links when it keeps this part of their distance from each; else it is rounding along one."""
PLACES = 30
"""Places of a narrow part that are tried."""


@dataclass(frozen=True)
class Spot:
    """A place that is too narrow.

    Attributes
    ----------
    owner : int
        Outline that is thin there; -1 when it is a gap.
    z : complex
        Where, m.
    width : float
        Between the two links at z, m.
    links : tuple of int
        The nearest link, then the nearest one that lies on the other side.
    """

    owner: int
    z: complex
    width: float
    links: tuple[int, ...]


class Shapes:
    """The faces as polygons whose chords follow the arcs far closer than the tolerance."""

    def __init__(
        self, links: Sequence[Link], nodes: Complexes, nested: Sequence[tuple[Loop, list[Loop]]], tolerance: float
    ) -> None:
        self.links, self.nodes, self.tolerance = links, nodes, tolerance
        size = max(float(np.ptp(nodes.real)), float(np.ptp(nodes.imag)))
        self._same = SAME_POINT * size
        self._traces = [link.edge.polyline(max(tolerance / 50.0, 1e-7 * size)) for link in links]
        self.faces = [(outer.owner, self._polygon(outer, holes)) for outer, holes in nested]
        self._sharp: dict[int, list[complex]] = {}
        for sector in sectors(links, nodes):
            if sector.angle < SHARP and (sector.angle > HAIR or sector.angle < 1e-6):
                self._sharp.setdefault(sector.owner, []).append(complex(nodes[sector.node]))

    def _polygon(self, outer: Loop, holes: Sequence[Loop]) -> BaseGeometry:
        return shapely.make_valid(shapely.Polygon(self._ring(outer), [self._ring(hole) for hole in holes]))

    def _ring(self, loop: Loop) -> Floats:
        traces = [self._traces[i] if forward else self._traces[i][::-1] for i, forward in loop.halves]
        z = np.concatenate([trace[:-1] for trace in traces])
        return np.asarray(np.column_stack((z.real, z.imag)))

    def thin(self) -> list[Spot]:
        """Return where faces are narrower than the tolerance."""
        return [spot for owner, polygon in self.faces for spot in self._spots(self._narrow(polygon), owner)]

    def gaps(self) -> list[Spot]:
        """Return where faces are apart, but by less than the tolerance: where what lies around them is narrow."""
        whole = shapely.union_all([polygon for _, polygon in self.faces])
        frame = shapely.box(*whole.bounds).buffer(10.0 * self.tolerance, join_style="mitre")
        return self._spots(self._narrow(frame.difference(whole)), NOBODY)

    def _narrow(self, polygon: BaseGeometry) -> BaseGeometry:
        """Return what an opening takes away, without the rounding that it leaves along the rest."""
        opened = polygon.buffer(-0.5 * self.tolerance).buffer(0.5 * self.tolerance)
        return polygon.difference(opened.buffer(MARGIN * self.tolerance))

    def _spots(self, lost: BaseGeometry, owner: int) -> list[Spot]:
        """Return the parts that are longer than a rounded corner and lie between two links that face each other."""
        spots = []
        for part in shapely.get_parts(lost):
            x0, y0, x1, y1 = part.bounds
            long = float(np.hypot(x1 - x0, y1 - y0))
            if long <= ROUNDING * self.tolerance or part.area <= 0.1 * self._same * long:
                continue
            if any(
                part.distance(shapely.Point(z.real, z.imag)) <= 0.5 * self.tolerance for z in self._sharp.get(owner, ())
            ):
                continue
            spots += self._spot(part, owner)
        return spots

    def _spot(self, part: BaseGeometry, owner: int) -> list[Spot]:
        """Return the largest place in a part that lies between two links, if any: its ends may be rounded corners."""
        triangles = shapely.get_parts(shapely.delaunay_triangles(part))
        triangles = triangles[np.argsort(-shapely.area(triangles))]
        places = shapely.centroid(triangles)
        for place in places[shapely.intersects(part, places)][:PLACES]:
            z = complex(place.x, place.y)
            sides = self._sides(z, owner)
            if len(sides) < 2:
                continue
            apart = [self._distance(i, z) for i in sides]
            if sum(apart) > self._same and min(apart) > BETWEEN * sum(apart):
                return [Spot(owner, z, sum(apart), sides)]
        return []

    def _sides(self, z: complex, owner: int) -> tuple[int, ...]:
        """Return the nearest link of the owner within the tolerance, and the nearest one that faces it."""
        near = [
            i
            for i, link in enumerate(self.links)
            if owner in (link.left, link.right) and self._distance(i, z) <= self.tolerance
        ]
        near.sort(key=lambda i: self._distance(i, z))
        if not near:
            return ()
        first = self._inward(near[0], z, owner)
        facing = [i for i in near[1:] if (self._inward(i, z, owner) * first.conjugate()).real < FACING]
        return (near[0], *facing[:1])

    def _distance(self, link: int, z: complex) -> float:
        return float(self.links[link].edge.distance(np.array([z]))[0])

    def _inward(self, link: int, z: complex, owner: int) -> complex:
        """Return the unit normal, where the link is nearest to z, that points to the owner's side."""
        edge = self.links[link].edge
        tangent = complex(edge.tangent(np.clip(edge.fraction(np.array([z])), 0.0, 1.0))[0])
        return 1j * tangent if self.links[link].left == owner else -1j * tangent
