"""Outlines -> the plan: which region lies where, and every curve between two regions or a region and the outside.

>>> square = Outline("slab", True, ((0, 0), (2, 0), (2, 1), (0, 1)), (OutlineEdge("bottom"),) + (OutlineEdge(),) * 3)
>>> plan = build_plan([square])
>>> float(plan.region_area[0]), sorted(label for curve in plan.curves for label in curve.labels)
(2.0, ['slab.bottom', 'slab.edge 2', 'slab.edge 3', 'slab.edge 4'])
"""

from collections.abc import Sequence
from dataclasses import replace
from typing import Literal

import numpy as np

from fem.docket import Docket, Stretch
from fem.errors import Problem, SectionError
from fem.quantities.units import SI, FileUnits, said_place
from fem.section.checks import check_partition, closed_notes, loops_of, narrow_spots, point_contacts, thin_voids
from fem.section.faces import nest
from fem.section.outline import Outline, OutlineEdge, extent
from fem.section.outline_checks import check_outlines
from fem.section.partition import NOBODY, SAME_POINT, Link, divide
from fem.section.plan import Curve, Face, Kind, Plan
from fem.section.snap import close
from fem.section.stretches import OutlineStretch, check_stretches, covers, placed

GAP_TOLERANCE = 1e-4
"""Default gap tolerance as a part of the section's size (diagonal of its box); common practice, no source."""

__all__ = [
    "GAP_TOLERANCE",
    "Curve",
    "Face",
    "Kind",
    "Outline",
    "OutlineEdge",
    "OutlineStretch",
    "Plan",
    "build_plan",
    "plan_of",
    "stretch_label",
]


def build_plan(
    outlines: Sequence[Outline],
    *,
    kind: Kind = "planar",
    gap_tolerance: float | None = None,
    close_gaps: bool = False,
    stretches: Sequence[OutlineStretch] = (),
    units: FileUnits = SI,
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
    units : FileUnits
        In which faults and notes speak of lengths and places.

    Raises
    ------
    SectionError
        With every fault found, each with its place.
    """
    revolution = kind == "revolution"
    _refuse(check_outlines(outlines, _rough_size(outlines), revolution=revolution, units=units))
    size = extent(outlines)
    tolerance = GAP_TOLERANCE * size if gap_tolerance is None else gap_tolerance
    stray = check_stretches(outlines, stretches, SAME_POINT * size, units)
    _refuse(thin_voids(outlines, size, tolerance, units) + stray)
    drawing = _Drawing(outlines, stretches, size)
    thin, gaps = narrow_spots(drawing.links, drawing.nodes, drawing.nested, tolerance)
    notes: list[str] = []
    if close_gaps and gaps:
        notes = closed_notes(outlines, drawing.links, gaps, units)
        outlines = close(outlines, tolerance)
        _refuse(check_outlines(outlines, size, revolution=revolution, units=units))
        drawing = _Drawing(outlines, stretches, size)
        thin, gaps = narrow_spots(drawing.links, drawing.nodes, drawing.nested, tolerance)
    spots = thin + gaps
    faults = check_partition(outlines, drawing.links, drawing.nested, spots, tolerance, tried=close_gaps, units=units)
    _refuse(faults)
    notes += point_contacts(outlines, drawing.links, drawing.nodes, units)
    return drawing.plan(kind, tuple(notes), tolerance)


def plan_of(docket: Docket) -> Plan:
    """Return the plan of a docket's section, its curves split and labelled for every stretch that an exposure names.

    Raises
    ------
    SectionError
        See `build_plan`.
    """
    section = docket.section
    outlines = [
        Outline(
            region.name,
            region.stock is not None,
            tuple((vertex.x, vertex.y) for vertex in region.outline),
            tuple(OutlineEdge(vertex.edge, vertex.via) for vertex in region.outline),
        )
        for region in section.regions
    ]
    stretches = {
        stretch_label(ref): ref for exposure in docket.exposures for ref in exposure.on if isinstance(ref, Stretch)
    }
    try:
        return build_plan(
            outlines,
            kind=section.kind,
            gap_tolerance=section.gap_tolerance,
            close_gaps=section.close_gaps,
            stretches=[OutlineStretch(ref.region, ref.start, ref.end, label) for label, ref in stretches.items()],
            units=docket.units,
        )
    except SectionError as error:
        raise SectionError(_spotted(fault, docket.units) for fault in error.problems) from None


def stretch_label(stretch: Stretch) -> str:
    """Return the label that `plan_of` gives to the curves on a stretch."""
    (x0, y0), (x1, y1) = stretch.start, stretch.end
    return f"stretch:{stretch.region}:{x0:.9g},{y0:.9g}:{x1:.9g},{y1:.9g}"


def _refuse(faults: list[Problem]) -> None:
    if faults:
        raise SectionError(faults)


def _spotted(fault: Problem, units: FileUnits) -> Problem:
    return fault if fault.xy is None else replace(fault, spot=said_place(*fault.xy, units))


def _rough_size(outlines: Sequence[Outline]) -> float:
    """Return the diagonal of the vertices' box, m: arcs may still be faulty."""
    xy = np.array([vertex for outline in outlines for vertex in outline.vertices], dtype=np.float64).reshape(-1, 2)
    return float(np.hypot(*np.ptp(xy, axis=0))) if len(xy) else 0.0


class _Drawing:
    """The outlines divided into links, without those inside one region, and the links walked into faces."""

    def __init__(self, outlines: Sequence[Outline], stretches: Sequence[OutlineStretch], size: float) -> None:
        self.outlines, self.size = outlines, size
        self.stretches = [on for on in (placed(outlines, stretch) for stretch in stretches) if on is not None]
        self.nodes, links = divide(outlines, [z for on in self.stretches for z in on.points], size)
        for link in links:
            link.left, link.right = (
                o if o != NOBODY and outlines[o].solid else NOBODY for o in (link.left, link.right)
            )
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
