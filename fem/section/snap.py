"""Closing gaps: points of one outline that lie within the gap tolerance of another are put exactly on it."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fem.section.edge import Edge
from fem.section.outline import Outline, OutlineEdge, Point


def close(outlines: Sequence[Outline], tolerance: float) -> tuple[Outline, ...]:
    """Return the outlines moved onto each other where they are closer than the tolerance.

    Points of a later outline go to vertices, else to edges, of the earlier ones; then vertices of earlier outlines that
    lie before the inner part of a later edge go to that edge.
    """
    done: list[Outline] = []
    for outline in outlines:
        done.append(_moved(outline, done, tolerance))
    for i in range(len(done)):
        done[i] = _moved(done[i], done[i + 1 :], tolerance)
    return tuple(done)


def _moved(outline: Outline, others: Sequence[Outline], tolerance: float) -> Outline:
    """Return the outline with its vertices and via points on the others where they are near."""
    if not others:
        return outline
    vertices = tuple(_onto(v, others, tolerance, to_vertices=True) for v in outline.vertices)
    edges = tuple(
        OutlineEdge(edge.name, None if edge.via is None else _onto(edge.via, others, tolerance, to_vertices=False))
        for edge in outline.edges
    )
    return replace(outline, vertices=vertices, edges=edges)


def _onto(point: Point, others: Sequence[Outline], tolerance: float, *, to_vertices: bool) -> Point:
    """Return the nearest vertex within the tolerance, else the nearest point of an edge within it, else the point."""
    z = complex(*point)
    edges = [edge for outline in others for edge in outline.chain]
    if to_vertices:
        corner = min((edge.start for edge in edges), key=lambda v: abs(v - z))
        if abs(corner - z) <= tolerance:
            return corner.real, corner.imag
    feet = [_foot(edge, z) for edge in edges]
    foot = min(feet, key=lambda v: abs(v - z))
    return (foot.real, foot.imag) if abs(foot - z) <= tolerance else point


def _foot(edge: Edge, z: complex) -> complex:
    return complex(edge.at(np.clip(edge.fraction(np.array([z])), 0.0, 1.0))[0])
