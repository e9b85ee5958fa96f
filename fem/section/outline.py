"""Outlines as they were drawn: plain closed chains of edges with names, before they cut each other."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from fem.section.edge import Edge, arc_through

Point = tuple[float, float]


@dataclass(frozen=True)
class OutlineEdge:
    """The edge that leaves a vertex.

    Attributes
    ----------
    name : str or None
        Several edges of one outline may carry one name; None: it is called by its number.
    via : (float, float) or None
        A point that the arc passes through, m; None: straight.
    """

    name: str | None = None
    via: Point | None = None


@dataclass(frozen=True)
class Outline:
    """A closed chain: edge i runs from vertex i to vertex i + 1, the last one back to the first.

    Attributes
    ----------
    name : str
    solid : bool
        False for a void.
    vertices : tuple of (x, y)
        m, either way round.
    edges : tuple of OutlineEdge
        One per vertex.
    """

    name: str
    solid: bool
    vertices: tuple[Point, ...]
    edges: tuple[OutlineEdge, ...]

    def __post_init__(self) -> None:
        """Refuse a call with lists of different length: a bug of the caller."""
        if len(self.vertices) != len(self.edges):
            raise ValueError(f'outline "{self.name}" has {len(self.vertices)} vertices and {len(self.edges)} edges')

    @property
    def kind(self) -> str:
        """Return "region" or "void"."""
        return "region" if self.solid else "void"

    def label(self, i: int) -> str:
        """Return the label of edge i (from 0): "deck.top", or "deck.edge 3" for the third edge when it has no name."""
        return f"{self.name}.{self.edges[i].name or f'edge {i + 1}'}"

    def place(self, *which: int) -> str:
        """Return in words where edges (from 0) are: ``region "deck", edge 3 ("top")``."""
        words = []
        for i in which:
            name = self.edges[i].name
            words.append(f"edge {i + 1}" + (f' ("{name}")' if name else ""))
        return ", ".join([f'{self.kind} "{self.name}"', " and ".join(words)]) if words else f'{self.kind} "{self.name}"'

    def made(self, i: int) -> Edge | None:
        """Return edge i; None when its arc does not span a circle."""
        start, end = complex(*self.vertices[i]), complex(*self.vertices[(i + 1) % len(self.vertices)])
        via = self.edges[i].via
        return Edge(start, end) if via is None else arc_through(start, complex(*via), end)

    @cached_property
    def chain(self) -> tuple[Edge, ...]:
        """Return all edges; only for outlines whose arcs all span a circle."""
        made = [self.made(i) for i in range(len(self.edges))]
        if None in made:
            raise ValueError(f'outline "{self.name}" has an arc without a circle')
        return tuple(edge for edge in made if edge is not None)

    @cached_property
    def area(self) -> float:
        """Return the signed area, m2, positive when the chain runs counter-clockwise."""
        origin = self.chain[0].start
        return sum(_shifted(edge, origin).area for edge in self.chain)


def _shifted(edge: Edge, origin: complex) -> Edge:
    """Return the edge seen from `origin`: a far-off section would lose digits of its area."""
    centre = None if edge.centre is None else edge.centre - origin
    return Edge(edge.start - origin, edge.end - origin, centre, edge.radius, edge.sweep)


def enclosed_area(loop: Sequence[Edge]) -> float:
    """Return the signed area inside a closed loop, m2."""
    return sum(_shifted(edge, loop[0].start).area for edge in loop)


def all_edges(outlines: Sequence[Outline]) -> Iterator[tuple[int, int, Edge]]:
    """Yield (outline, position, edge) of every edge."""
    for o, outline in enumerate(outlines):
        for i, edge in enumerate(outline.chain):
            yield o, i, edge


def extent(outlines: Sequence[Outline]) -> float:
    """Return the diagonal of the box around all outlines with their arcs, m."""
    z = np.concatenate([edge.at(np.linspace(0.0, 1.0, 33)) for _, _, edge in all_edges(outlines)])
    return float(np.hypot(np.ptp(z.real), np.ptp(z.imag)))
