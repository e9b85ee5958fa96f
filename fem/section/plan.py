"""The plan of a section: regions that touch along curves. Data only; `fem.section.build` makes it."""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from fem.section.edge import Complexes, Edge, Floats
from fem.section.outline import Point
from fem.section.partition import Link

Kind = Literal["planar", "revolution"]


@dataclass(frozen=True)
class Curve:
    """A line or an arc with one region, or the outside, on each side.

    Attributes
    ----------
    labels : frozenset of str
        Every edge of every outline that it lies on ("deck.top", "deck.edge 3"), and every stretch.
    left, right : int
        Region on each side, seen from start to end; -1: outside or void.
    kind : "line" or "arc"
    start, end : (x, y)
        m.
    centre : (x, y) or None
        Of an arc, m.
    radius : float
        Of an arc, m; 0 for a line.
    length : float
        Exact, m.
    edge : Edge
        The same in the form that computes.
    """

    labels: frozenset[str]
    left: int
    right: int
    kind: Literal["line", "arc"]
    start: Point
    end: Point
    centre: Point | None
    radius: float
    length: float
    edge: Edge


@dataclass(frozen=True)
class Face:
    """A connected piece of a region.

    Attributes
    ----------
    region : int
    loops : tuple of tuple of (curve, forward)
        The outer loop counter-clockwise, then the loops of its holes clockwise; `forward` is True where the curve is
        run from its start.
    """

    region: int
    loops: tuple[tuple[tuple[int, bool], ...], ...]


@dataclass(frozen=True, eq=False)
class Plan:
    """The section as regions that touch along curves.

    Attributes
    ----------
    kind : "planar" or "revolution"
        In a body of revolution x is the radius.
    region_names : tuple of str
        In drawing order, without voids.
    region_area : (R,) float
        Exact area in the section plane, m2.
    curves : tuple of Curve
    faces : tuple of Face
    notes : tuple of str
        What was noticed or mended: gaps closed, regions that touch in one point only.
    hidden : frozenset of str
        Labels of edges and stretches that lie on no curve, since a later region covers them or they lie in a void.
    size : float
        Diagonal of the section's box, m.
    gap_tolerance : float
        m.
    """

    kind: Kind
    region_names: tuple[str, ...]
    region_area: Floats
    curves: tuple[Curve, ...]
    faces: tuple[Face, ...]
    notes: tuple[str, ...]
    hidden: frozenset[str]
    size: float
    gap_tolerance: float

    def links(self) -> tuple[Complexes, list[Link]]:
        """Return the points at which curves end, and the curves as links between them (sides are regions)."""
        numbers: dict[complex, int] = {}
        links = []
        for curve in self.curves:
            a, b = (numbers.setdefault(z, len(numbers)) for z in (curve.edge.start, curve.edge.end))
            links.append(Link(a, b, curve.edge, [], curve.left, curve.right))
        return np.array(list(numbers), dtype=np.complex128), links
