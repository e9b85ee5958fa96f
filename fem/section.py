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
from fem.errors import SectionError
from fem.faces import Loop, nest, walk
from fem.outline import Outline, OutlineEdge, Point, extent
from fem.outline_checks import check_outlines
from fem.partition import NOBODY, Link, divide
from fem.section_checks import check_partition, closed_notes, point_contacts, tangled, thin_voids
from fem.snap import close
from fem.stretches import OutlineStretch, check_stretches, ends_of, on_stretch

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
    faults = check_outlines(outlines, _size(outlines), revolution=kind == "revolution")
    if faults:
        raise SectionError(faults)
    size = extent(outlines)
    tolerance = GAP_TOLERANCE * size if gap_tolerance is None else gap_tolerance
    faults = thin_voids(outlines, tolerance) + check_stretches(outlines, stretches)
    if faults:
        raise SectionError(faults)
    drawing = _Drawing(outlines, stretches, size, tolerance)
    notes: list[str] = []
    if close_gaps and drawing.gaps():
        closed = close(outlines, tolerance)
        faults = check_outlines(closed, size, revolution=kind == "revolution")
        if faults:
            raise SectionError(faults)
        notes = closed_notes(drawing.gaps(), drawing.links, outlines)
        drawing = _Drawing(closed, stretches, size, tolerance)
    faults = check_partition(drawing.outlines, drawing.links, drawing.nested, drawing.spots(), tolerance, tried=close_gaps)
    if faults:
        raise SectionError(faults)
    notes += point_contacts(drawing.links, drawing.nodes, drawing.outlines)
    return _plan(drawing, kind, tuple(notes))
