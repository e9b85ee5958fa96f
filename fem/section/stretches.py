"""Stretches of an outline between two points that need not be vertices: moved or inserted vertices do not matter."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fem.errors import Problem
from fem.quantities.units import SI, FileUnits, said_place
from fem.section.outline import Outline, Point


@dataclass(frozen=True)
class OutlineStretch:
    """The part of an outline from one point to another, counter-clockwise.

    Attributes
    ----------
    outline : str
        Name of the region or void.
    start, end : (x, y)
        m; the nearest points of the outline count.
    label : str
        Given to every curve on it.
    """

    outline: str
    start: Point
    end: Point
    label: str


@dataclass(frozen=True)
class Placed:
    """A stretch found on its outline: distances along the chain as it was drawn, m, and the two points."""

    outline: int
    label: str
    start: float
    end: float
    points: tuple[complex, complex]
    counter_clockwise: bool
    around: float


def placed(outlines: Sequence[Outline], stretch: OutlineStretch) -> Placed | None:
    """Return the stretch on its outline; None when no outline has that name."""
    for o, outline in enumerate(outlines):
        if outline.name == stretch.outline:
            (s0, z0), (s1, z1) = _nearest(outline, complex(*stretch.start)), _nearest(outline, complex(*stretch.end))
            around = sum(edge.length for edge in outline.chain)
            return Placed(o, stretch.label, s0, s1, (z0, z1), outline.area > 0.0, around)
    return None


def _nearest(outline: Outline, z: complex) -> tuple[float, complex]:
    """Return how far along the chain the nearest point lies, and that point."""
    distance = [float(edge.distance(np.array([z]))[0]) for edge in outline.chain]
    i = int(np.argmin(distance))
    edge = outline.chain[i]
    f = np.clip(edge.fraction(np.array([z])), 0.0, 1.0)
    before = sum(e.length for e in outline.chain[:i])
    return before + float(f[0]) * edge.length, complex(edge.at(f)[0])


def covers(stretch: Placed, outline: Outline, position: int, z: complex) -> bool:
    """Return whether a point on edge `position` of the stretch's outline lies on the stretch."""
    edge = outline.chain[position]
    s = sum(e.length for e in outline.chain[:position]) + float(edge.fraction(np.array([z]))[0]) * edge.length
    if stretch.counter_clockwise:
        return (s - stretch.start) % stretch.around <= (stretch.end - stretch.start) % stretch.around
    return (stretch.start - s) % stretch.around <= (stretch.start - stretch.end) % stretch.around


def check_stretches(
    outlines: Sequence[Outline], stretches: Sequence[OutlineStretch], tolerance: float, units: FileUnits = SI
) -> list[Problem]:
    """Return the stretches that have no outline or no length."""
    found = []
    names = ", ".join(f'"{outline.name}"' for outline in outlines)
    for stretch in stretches:
        place = f'stretch of "{stretch.outline}" from {said_place(*stretch.start, units)}'
        on = placed(outlines, stretch)
        if on is None:
            found.append(
                Problem(place, f'"{stretch.outline}"', f"one of {names}", "name a region or void of the section")
            )
        elif abs(on.points[0] - on.points[1]) <= tolerance:
            xy = (on.points[0].real, on.points[0].imag)
            hint = "move one end; a whole outline is written as region.*"
            found.append(
                Problem(place, "a stretch of no length", "two ends at different points of the outline", hint, xy=xy)
            )
    return found
