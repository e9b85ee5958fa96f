"""Links with a left and a right -> faces: connected parts of one region, each with the loop around it and its holes."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from fem.section.edge import Complexes, Edge, Floats, winding
from fem.section.outline import enclosed_area
from fem.section.partition import Link

Half = tuple[int, bool]
"""A link and whether it is run forwards; the face lies to its left."""


@dataclass(frozen=True)
class Loop:
    """A closed walk with the same owner all along its left."""

    halves: tuple[Half, ...]
    edges: tuple[Edge, ...]
    owner: int
    area: float


def directed(link: Link, *, forward: bool) -> Edge:
    """Return the link's edge in the given direction."""
    return link.edge if forward else link.edge.reversed()


def walk(links: Sequence[Link], nodes: Complexes) -> list[Loop]:
    """Return every loop that keeps a face to its left: counter-clockwise around a face, clockwise around a hole.

    Raises
    ------
    ValueError
        If two owners lie left of one loop: links cross each other. Carries (x, y) of the spot.
    """
    following = _following(links, nodes)
    left_to_walk = set(following)
    loops = []
    while left_to_walk:
        first = min(left_to_walk)
        halves, half = [], first
        while half in left_to_walk:
            left_to_walk.remove(half)
            halves.append(half)
            half = following[half]
        edges = tuple(directed(links[i], forward=forward) for i, forward in halves)
        owner = {links[i].left if forward else links[i].right for i, forward in halves}
        if len(owner) != 1 or half != first:
            raise ValueError(edges[0].middle.real, edges[0].middle.imag)
        loops.append(Loop(tuple(halves), edges, owner.pop(), enclosed_area(edges)))
    return loops


def _around(links: Sequence[Link], nodes: Complexes) -> Iterator[tuple[int, list[Half], Floats]]:
    """Yield each node with the halves that leave it, counter-clockwise, and their directions, rad.

    Seen at one small distance from the node, arcs that leave along one tangent are apart, in the order of curvature.
    """
    leaving: dict[int, list[Half]] = {}
    for i, link in enumerate(links):
        leaving.setdefault(link.a, []).append((i, True))
        leaving.setdefault(link.b, []).append((i, False))
    for node, halves in leaving.items():
        edges = [directed(links[i], forward=forward) for i, forward in halves]
        reach = 0.1 * min(edge.length for edge in edges)
        angle = np.array([np.angle(complex(e.at(np.array([reach / e.length]))[0]) - nodes[node]) for e in edges])
        order = np.argsort(angle)
        yield node, [halves[k] for k in order], angle[order]


def _following(links: Sequence[Link], nodes: Complexes) -> dict[Half, Half]:
    """Return the half that follows each half around the face to its left."""
    after: dict[Half, Half] = {}
    for _, around, _ in _around(links, nodes):
        for k, (i, forward) in enumerate(around):
            after[(i, not forward)] = around[k - 1]  # arriving against this half, leave by its neighbour clockwise
    return after


@dataclass(frozen=True)
class Sector:
    """The corner of one owner at a node.

    Attributes
    ----------
    node, owner : int
    angle : float
        Between the tangents, rad; 0 in a cusp.
    begins : float
        Direction of its clockwise side, rad.
    """

    node: int
    owner: int
    angle: float
    begins: float


def sectors(links: Sequence[Link], nodes: Complexes) -> list[Sector]:
    """Return all corners at all nodes."""
    found = []
    for node, around, seen in _around(links, nodes):
        tangent = [float(np.angle(directed(links[i], forward=f).tangent(np.array([0.0]))[0])) for i, f in around]
        for k, (i, forward) in enumerate(around):
            following = (k + 1) % len(around)
            opening = (seen[following] - seen[k]) % (2.0 * np.pi) if len(around) > 1 else 2.0 * np.pi
            bend = (tangent[following] - tangent[k] - opening + np.pi) % (2.0 * np.pi) - np.pi
            owner = links[i].left if forward else links[i].right
            found.append(Sector(node, owner, float(np.clip(opening + bend, 0.0, 2.0 * np.pi)), tangent[k]))
    return found


def nest(loops: Sequence[Loop]) -> list[tuple[Loop, list[Loop]]]:
    """Return each outer loop of somebody's face with the loops of its holes."""
    outer = sorted((loop for loop in loops if loop.area > 0.0 and loop.owner >= 0), key=lambda loop: loop.area)
    holes: list[list[Loop]] = [[] for _ in outer]
    for loop in loops:
        if loop.area > 0.0 or loop.owner < 0:
            continue
        z = np.array([loop.edges[0].middle])
        for k, around in enumerate(outer):
            if around.owner == loop.owner and winding(around.edges, z)[0] > 0:
                holes[k].append(loop)
                break
    return list(zip(outer, holes, strict=True))
