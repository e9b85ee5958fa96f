"""Places narrower than the gap tolerance: hair-thin parts of a face, and gaps between faces. Found by opening and closing in the
sense of mathematical morphology (Serra, Image Analysis and Mathematical Morphology, 1982, ch. II) with a disc as wide as the tolerance.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from fem.edge import Complexes, Floats
from fem.faces import Loop, sectors
from fem.partition import NOBODY, Link

SHARP = np.deg2rad(45.0)
"""Inside a corner sharper than this an opening takes away more than a rounding of the corner, though nothing is hair-thin."""
HAIR = np.deg2rad(0.5)
"""A corner of straight sides sharper than this is a hair, not a corner; common practice, no source."""
ROUNDING = 2.0
"""An opening rounds corners of `SHARP` and more over less than so many tolerances; what is longer is thin."""
FACING = -0.5
"""Two links face each other when the cosine between their inward normals is below this."""


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

    def __init__(self, links: Sequence[Link], nodes: Complexes, nested: Sequence[tuple[Loop, list[Loop]]], tolerance: float) -> None:
        self.links, self.nodes, self.tolerance = links, nodes, tolerance
        size = max(float(np.ptp(nodes.real)), float(np.ptp(nodes.imag)))
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
        spots = []
        for owner, polygon in self.faces:
            opened = polygon.buffer(-0.5 * self.tolerance).buffer(0.5 * self.tolerance)
            spots += self._spots(polygon.difference(opened), owner)
        return spots

    def gaps(self) -> list[Spot]:
        """Return where faces are apart, but by less than the tolerance."""
        whole = shapely.union_all([polygon for _, polygon in self.faces])
        closed = whole.buffer(0.5 * self.tolerance).buffer(-0.5 * self.tolerance)
        return self._spots(closed.difference(whole), NOBODY)

    def _spots(self, lost: BaseGeometry, owner: int) -> list[Spot]:
        """Return the parts that are longer than a rounded corner and lie between two links that face each other."""
        spots = []
        for part in shapely.get_parts(lost):
            x0, y0, x1, y1 = part.bounds
            if np.hypot(x1 - x0, y1 - y0) <= ROUNDING * self.tolerance:
                continue
            if any(part.distance(shapely.Point(z.real, z.imag)) <= 0.5 * self.tolerance for z in self._sharp.get(owner, ())):
                continue
            point = part.representative_point()
            z = complex(point.x, point.y)
            sides = self._sides(z, owner)
            if len(sides) == 2:  # otherwise only rounding along one link
                spots.append(Spot(owner, z, sum(self._distance(i, z) for i in sides), sides))
        return spots

    def _sides(self, z: complex, owner: int) -> tuple[int, ...]:
        """Return the nearest link of the owner within the tolerance, and the nearest one that faces it."""
        near = [i for i, link in enumerate(self.links) if owner in (link.left, link.right) and self._distance(i, z) <= self.tolerance]
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
