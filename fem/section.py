"""Outlines -> the plan: which region lies where, and every curve between two regions or between a region and the outside.

>>> square = Outline("slab", True, ((0, 0), (2, 0), (2, 1), (0, 1)), (OutlineEdge("bottom"),) + (OutlineEdge(),) * 3)
>>> plan = build_plan([square])
>>> float(plan.region_area[0]), sorted(label for curve in plan.curves for label in curve.labels)
(2.0, ['slab.bottom', 'slab.edge 2', 'slab.edge 3', 'slab.edge 4'])
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from fem.edge import Complexes, Edge, Floats
from fem.errors import Problem, SectionError
from fem.faces import nest
from fem.outline import Outline, OutlineEdge, Point, extent
from fem.outline_checks import check_outlines
from fem.partition import NOBODY, SAME_POINT, Link, divide
from fem.section_checks import check_partition, closed_notes, loops_of, narrow_spots, point_contacts, thin_voids
from fem.snap import close
from fem.stretches import OutlineStretch, check_stretches, covers, placed

Kind = Literal["planar", "revolution"]
GAP_TOLERANCE = 1e-4
"""Default gap tolerance as a part of the section's size (diagonal of its box); common practice, no source."""

__all__ = ["GAP_TOLERANCE", "Curve", "Face", "Kind", "Outline", "OutlineEdge", "OutlineStretch", "Plan", "build_plan"]


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
        The outer loop counter-clockwise, then the loops of its holes clockwise; `forward` tells whether the curve is run from its start.
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


def build_plan(
    outlines: Sequence[Outline],
    *,
    kind: Kind = "planar",
    gap_tolerance: float | None = None,
    close_gaps: bool = False,
    stretches: Sequence[OutlineStretch] = (),
) -> Plan:
    """Return the plan of outlines of which later ones cut earlier ones.

    Parameters
    ----------
    outlines : sequence of Outline
        In drawing order.
    kind : "planar" or "revolution"
    gap_tolerance : float, optional
        Parts and gaps narrower than this are refused, m; default `GAP_TOLERANCE` of the section's size.
    close_gaps : bool
        Close gaps that are narrower than the tolerance, with a note each, instead of refusing them.
    stretches : sequence of OutlineStretch
        Curves get their labels, and are split where they end.

    Raises
    ------
    SectionError
        With every fault found, each with its place.
    """
    revolution = kind == "revolution"
    _refuse(check_outlines(outlines, _rough_size(outlines), revolution=revolution))
    size = extent(outlines)
    tolerance = GAP_TOLERANCE * size if gap_tolerance is None else gap_tolerance
    _refuse(thin_voids(outlines, size, tolerance) + check_stretches(outlines, stretches, SAME_POINT * size))
    drawing = _Drawing(outlines, stretches, size)
    thin, gaps = narrow_spots(drawing.links, drawing.nodes, drawing.nested, tolerance)
    notes: list[str] = []
    if close_gaps and gaps:
        notes = closed_notes(outlines, drawing.links, gaps)
        outlines = close(outlines, tolerance)
        _refuse(check_outlines(outlines, size, revolution=revolution))
        drawing = _Drawing(outlines, stretches, size)
        thin, gaps = narrow_spots(drawing.links, drawing.nodes, drawing.nested, tolerance)
    _refuse(check_partition(outlines, drawing.links, drawing.nested, thin + gaps, tolerance, tried=close_gaps))
    notes += point_contacts(outlines, drawing.links, drawing.nodes)
    return drawing.plan(kind, tuple(notes), tolerance)


def _refuse(faults: list[Problem]) -> None:
    if faults:
        raise SectionError(faults)


def _rough_size(outlines: Sequence[Outline]) -> float:
    """Return the diagonal of the vertices' box, m: arcs may still be faulty."""
    xy = np.array([vertex for outline in outlines for vertex in outline.vertices], dtype=np.float64).reshape(-1, 2)
    return float(np.hypot(*np.ptp(xy, axis=0))) if len(xy) else 0.0


class _Drawing:
    """The outlines divided into links, and the links walked into faces; links between two parts of one region are left out."""

    def __init__(self, outlines: Sequence[Outline], stretches: Sequence[OutlineStretch], size: float) -> None:
        self.outlines, self.size = outlines, size
        self.stretches = [on for on in (placed(outlines, stretch) for stretch in stretches) if on is not None]
        self.nodes, links = divide(outlines, [z for on in self.stretches for z in on.points], size)
        for link in links:
            link.left, link.right = (o if o != NOBODY and outlines[o].solid else NOBODY for o in (link.left, link.right))
        self.links = [link for link in links if link.left != link.right]
        self.nested = nest(loops_of(self.links, self.nodes))

    def plan(self, kind: Kind, notes: tuple[str, ...], tolerance: float) -> Plan:
        """Return the drawing as a plan, in which only solid outlines are numbered."""
        solids = [o for o, outline in enumerate(self.outlines) if outline.solid]
        number = {NOBODY: NOBODY} | {o: r for r, o in enumerate(solids)}
        area = np.zeros(len(solids))
        for outer, holes in self.nested:
            area[number[outer.owner]] += outer.area + sum(hole.area for hole in holes)
        curves = tuple(self._curve(link, number) for link in self.links)
        faces = tuple(
            Face(number[outer.owner], (outer.halves, *(hole.halves for hole in holes))) for outer, holes in self.nested
        )
        used = {label for curve in curves for label in curve.labels}
        drawn = {outline.label(i) for outline in self.outlines for i in range(len(outline.edges))}
        drawn |= {on.label for on in self.stretches}
        names = tuple(self.outlines[o].name for o in solids)
        return Plan(kind, names, area, curves, faces, notes, frozenset(drawn - used), self.size, tolerance)

    def _curve(self, link: Link, number: dict[int, int]) -> Curve:
        edge = link.edge
        labels = {self.outlines[o].label(i) for o, i in link.origins}
        for on in self.stretches:
            mine = [i for o, i in link.origins if o == on.outline]
            if any(covers(on, self.outlines[on.outline], i, edge.middle) for i in mine):
                labels.add(on.label)
        centre = None if edge.centre is None else (edge.centre.real, edge.centre.imag)
        ends = (edge.start.real, edge.start.imag), (edge.end.real, edge.end.imag)
        form: Literal["line", "arc"] = "line" if edge.centre is None else "arc"
        sides = number[link.left], number[link.right]
        return Curve(frozenset(labels), *sides, form, *ends, centre, edge.radius, edge.length, edge)
