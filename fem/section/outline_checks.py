"""What an outline must be by itself, before it meets the others; every fault is listed."""

from collections.abc import Sequence

import numpy as np

from fem.errors import Problem
from fem.quantities.units import SI, FileUnits, said, said_place
from fem.section.edge import crossings
from fem.section.outline import Outline
from fem.section.partition import SAME_POINT, near_pairs

AXIS = "a body of revolution has x = r, the distance from its axis: r >= 0"


def check_outlines(
    outlines: Sequence[Outline], size: float, *, revolution: bool, units: FileUnits = SI
) -> list[Problem]:
    """Return every fault of the outlines by themselves.

    Parameters
    ----------
    outlines : sequence of Outline
    size : float
        Of the section, m: it says which points are the same.
    revolution : bool
        Then x is a radius.
    units : FileUnits
        Of the lengths in messages.
    """
    found = _names(outlines)
    for outline in outlines:
        faults = _vertices(outline, SAME_POINT * size, units)
        if not faults:
            faults = _crossings(outline, SAME_POINT * size)
        found += faults
        if revolution:
            found += _behind_axis(outline, SAME_POINT * size, units)
    return found


def _names(outlines: Sequence[Outline]) -> list[Problem]:
    found = []
    names = [outline.name for outline in outlines]
    for name in sorted({n for n in names if names.count(n) > 1}):
        found.append(
            Problem(
                f'section, name "{name}"',
                f'"{name}"',
                "a name of its own for each region and void",
                "rename one of them",
            )
        )
    if not any(outline.solid for outline in outlines):
        found.append(Problem("section", "", "at least one region that is not a void", "draw a region with a stock"))
    for outline in outlines:
        numbers = {f"edge {k + 1}": k for k in range(len(outline.edges))}
        for i, edge in enumerate(outline.edges):
            if edge.name == "*" or numbers.get(edge.name or "", i) != i:
                what = "any name but * and the number of another edge"
                found.append(Problem(outline.place(i), f'"{edge.name}"', what, "rename the edge"))
    return found


def _xy(z: complex) -> tuple[float, float]:
    return float(z.real), float(z.imag)


def _vertices(outline: Outline, tolerance: float, units: FileUnits) -> list[Problem]:
    n, found = len(outline.vertices), []
    if not np.isfinite(np.array(outline.vertices, dtype=np.float64)).all():
        return [
            Problem(
                outline.place(), "a coordinate that is not a finite number", "finite coordinates", "mend the coordinate"
            )
        ]
    arcs = sum(edge.via is not None for edge in outline.edges)
    if n < 2 or (n == 2 and arcs == 0):
        allowed = "at least 3 vertices, or 2 when an edge is an arc"
        xy = outline.vertices[0] if n else None
        found.append(
            Problem(
                outline.place(),
                f"an outline of {n} {'vertex' if n == 1 else 'vertices'}",
                allowed,
                "add vertices",
                xy=xy,
            )
        )
        return found
    for i, edge in enumerate(outline.edges):
        start, end = complex(*outline.vertices[i]), complex(*outline.vertices[(i + 1) % n])
        if abs(end - start) <= tolerance:
            hint = "delete one of its two vertices; a full circle is drawn as two arcs"
            found.append(
                Problem(outline.place(i), "an edge of no length", "two ends that are apart", hint, xy=_xy(start))
            )
        elif edge.via is not None and outline.made(i) is None:
            value = f"via point {said_place(*edge.via, units)}"
            hint = "move the point off the straight line, or take it away for a straight edge"
            found.append(
                Problem(outline.place(i), value, "a point that lies off the line through both ends", hint, xy=edge.via)
            )
    return found


def _crossings(outline: Outline, tolerance: float) -> list[Problem]:
    """Return where edges meet besides the vertex that neighbours share."""
    chain, n, found = outline.chain, len(outline.chain), []
    vertices = np.array([edge.start for edge in chain])
    for i, j in near_pairs(chain, tolerance):
        for z in crossings(chain[i], chain[j], tolerance):
            # A crossing in a vertex is told below as a touch, unless it is the one that neighbours share.
            if np.abs(vertices - z).min() > 10.0 * tolerance:
                found.append(_crossing(outline, "crosses itself", (i, j), z))
    for i in range(n):
        for k in chain[i].near(vertices, tolerance):
            if k not in (i, (i + 1) % n):
                found.append(_crossing(outline, "touches itself", (i, int(k)), chain[k].start))
    if n == 2 and abs(chain[0].middle - chain[1].middle) <= 10.0 * tolerance:
        found.append(_crossing(outline, "runs back on itself", (0, 1), chain[0].middle))
    return found


def _crossing(outline: Outline, how: str, which: tuple[int, int], z: complex) -> Problem:
    hint = "move or reorder the vertices; draw a hole as a void of its own"
    return Problem(
        outline.place(*which),
        f"an outline that {how}",
        "edges that meet only at the vertex they share",
        hint,
        xy=_xy(z),
    )


def _behind_axis(outline: Outline, tolerance: float, units: FileUnits) -> list[Problem]:
    found = []
    for i, (x, y) in enumerate(outline.vertices):
        if x < -tolerance:
            hint = "move the vertex to r >= 0, or mirror the section"
            found.append(
                Problem(f"{outline.place()}, vertex {i + 1}", f"r = {said(x, 'length', units)}", AXIS, hint, xy=(x, y))
            )
    for i in range(len(outline.edges)):
        edge = outline.made(i)
        if edge is None or edge.centre is None or min(edge.start.real, edge.end.real) < -tolerance:
            continue
        leftmost = edge.centre - edge.radius
        if leftmost.real < -tolerance and edge.distance(np.array([leftmost]))[0] <= tolerance:
            hint = "flatten the arc or move it to r >= 0"
            value = f"an arc that reaches r = {said(float(leftmost.real), 'length', units)}"
            found.append(Problem(outline.place(i), value, AXIS, hint, xy=_xy(leftmost)))
    return found
