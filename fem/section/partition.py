"""Outlines that lie on each other -> links: pieces of edges that meet only at their ends, with who lies left and right.

The later outline wins wherever outlines overlap. Points closer than `SAME_POINT` of the section's size are one point.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.section.edge import Complexes, Edge, crossings, winding
from fem.section.outline import Outline, all_edges

SAME_POINT = 1e-9
"""Of the section's size; common practice: far above float64 rounding (1e-16), far below any drawn size."""
SAME_CURVE = 3.0
"""Pieces with the same ends whose middles are within so many same-point distances are one piece."""
LOOK_ASIDE = 6.0
"""Who lies beside a piece is asked so many same-point distances aside: beyond what `SAME_CURVE` may have merged."""
NOBODY = -1


@dataclass
class Link:
    """A piece of one or more outline edges between two nodes.

    Attributes
    ----------
    a, b : int
        Nodes at its start and end.
    edge : Edge
        Its exact shape.
    origins : list of (outline, edge)
        Every outline edge that it lies on.
    left, right : int
        Outline on each side; -1: nobody.
    """

    a: int
    b: int
    edge: Edge
    origins: list[tuple[int, int]] = field(default_factory=list)
    left: int = NOBODY
    right: int = NOBODY


class Nodes:
    """Points, each within a tolerance of no other; the first one registered stands for those that follow."""

    def __init__(self, tolerance: float) -> None:
        self.tolerance = tolerance
        self.points: list[complex] = []
        self._cells: dict[tuple[int, int], list[int]] = {}

    def add(self, z: complex) -> int:
        """Return the number of the node at z, which is new if there was none."""
        i, j = int(z.real // self.tolerance), int(z.imag // self.tolerance)
        for di in (-1, 0, 1):
            for dj in (-1, 0, 1):
                for k in self._cells.get((i + di, j + dj), ()):
                    if abs(self.points[k] - z) <= self.tolerance:
                        return k
        self._cells.setdefault((i, j), []).append(len(self.points))
        self.points.append(z)
        return len(self.points) - 1


def divide(outlines: Sequence[Outline], points: Sequence[complex], size: float) -> tuple[Complexes, list[Link]]:
    """Return the nodes and all links of the outlines; links also end at those of the given points that lie on an edge.

    Parameters
    ----------
    outlines : sequence of Outline
        Each a simple loop.
    points : sequence of complex
        m.
    size : float
        Of the section, m.
    """
    tolerance = SAME_POINT * size
    edges = list(all_edges(outlines))
    nodes = Nodes(tolerance)
    for _, _, edge in edges:
        nodes.add(edge.start)
    for z in points:
        nodes.add(z)
    for a, b in near_pairs([edge for _, _, edge in edges], tolerance):
        for z in crossings(edges[a][2], edges[b][2], tolerance):
            nodes.add(z)
    points_found = np.array(nodes.points)
    links: dict[tuple[int, int], list[Link]] = {}
    for outline, position, edge in edges:
        for piece in _pieces(edge, points_found, tolerance):
            _note(links, piece, (outline, position), SAME_CURVE * tolerance)
    found = [link for group in links.values() for link in group]
    _ask_aside(outlines, found, LOOK_ASIDE * tolerance)
    return points_found, found


def near_pairs(edges: Sequence[Edge], tolerance: float) -> list[tuple[int, int]]:
    """Return the pairs of edges whose boxes touch."""
    boxes = np.array([edge.box() for edge in edges])
    lo, hi = (np.column_stack((corner.real, corner.imag)) for corner in boxes.T)
    near = []
    for i in range(len(edges) - 1):
        apart = (lo[i + 1 :] > hi[i] + tolerance) | (hi[i + 1 :] < lo[i] - tolerance)
        near += [(i, i + 1 + int(j)) for j in np.flatnonzero(~apart.any(axis=1))]
    return near


def _pieces(edge: Edge, nodes: Complexes, tolerance: float) -> list[Link]:
    """Return the links between consecutive nodes on one edge."""
    on = edge.near(nodes, 2.0 * tolerance)
    f = edge.fraction(nodes[on])
    near_start, near_end = (np.abs(nodes[on] - end) <= 2.0 * tolerance for end in (edge.start, edge.end))
    f = np.where(near_start, 0.0, np.where(near_end, 1.0, f))
    order = np.argsort(f)
    on, f = on[order], f[order]
    return [
        Link(
            int(a),
            int(b),
            edge.between(complex(nodes[a]), complex(nodes[b]), from_fraction=float(fa), to_fraction=float(fb)),
        )
        for a, b, fa, fb in zip(on[:-1], on[1:], f[:-1], f[1:], strict=True)
    ]


def _note(links: dict[tuple[int, int], list[Link]], piece: Link, origin: tuple[int, int], tolerance: float) -> None:
    """Add a piece, or its origin to the link that is the same curve."""
    group = links.setdefault((min(piece.a, piece.b), max(piece.a, piece.b)), [])
    for link in group:
        if abs(link.edge.middle - piece.edge.middle) <= tolerance:
            if origin not in link.origins:
                link.origins.append(origin)
            return
    piece.origins.append(origin)
    group.append(piece)


def _ask_aside(outlines: Sequence[Outline], links: Sequence[Link], aside: float) -> None:
    """Fill in who lies left and right of each link: the last outline around a point just beside its middle."""
    middle = np.array([link.edge.middle for link in links])
    normal = 1j * np.array([complex(link.edge.tangent(np.array([0.5]))[0]) for link in links])
    left, right = owners(outlines, middle + aside * normal), owners(outlines, middle - aside * normal)
    for link, at_left, at_right in zip(links, left, right, strict=True):
        link.left, link.right = int(at_left), int(at_right)


def owners(outlines: Sequence[Outline], z: Complexes) -> NDArray[np.int_]:
    """Return the last outline around each point (n,), -1 where there is none; points on an outline have no answer."""
    owner = np.full(len(z), NOBODY)
    for o, outline in enumerate(outlines):
        owner[winding(outline.chain, z) != 0] = o
    return owner
