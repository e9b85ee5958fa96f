"""Rays against edges: how far it is to the first one."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fem.section.edge import Complexes, Edge, Floats

ON_EDGE = 1e-9
"""A ray through the end of an edge hits it; as a part of the edge's length."""


def hits(z: Complexes, direction: Complexes, edges: Sequence[Edge], nearest: float) -> tuple[Floats, NDArray[np.int64]]:
    """Return the distance to the first edge that each ray strikes, and that edge's index.

    Parameters
    ----------
    z, direction : (n,) complex
        Starts, m, and unit directions.
    edges : sequence of Edge
    nearest : float
        Hits nearer than this are the start itself, m.

    Returns
    -------
    distance : (n,) float
        m; infinite where nothing is struck.
    index : (n,) int
    """
    best, which = np.full(len(z), np.inf), np.zeros(len(z), dtype=np.int64)
    for i, edge in enumerate(edges):
        for t in _line(z, direction, edge) if edge.centre is None else _arc(z, direction, edge):
            better = (t > nearest) & (t < best)
            best[better], which[better] = t[better], i
    return best, which


def _line(z: Complexes, direction: Complexes, edge: Edge) -> list[Floats]:
    u, w = edge.end - edge.start, edge.start - z
    with np.errstate(divide="ignore", invalid="ignore"):
        across = direction.real * u.imag - direction.imag * u.real
        t = (w.real * u.imag - w.imag * u.real) / across
        s = (w.real * direction.imag - w.imag * direction.real) / across
    parallel = np.abs(across) <= 1e-12 * abs(u)
    return [np.where(~parallel & (s >= -ON_EDGE) & (s <= 1.0 + ON_EDGE), t, np.inf)]


def _arc(z: Complexes, direction: Complexes, edge: Edge) -> list[Floats]:
    w = z - edge.hub
    b = (w * direction.conj()).real
    square = b**2 - (np.abs(w) ** 2 - edge.radius**2)
    root = np.sqrt(np.maximum(square, 0.0))
    found = []
    for t in (-b - root, -b + root):
        f = edge.fraction(z + t * direction)
        found.append(np.where((square >= 0.0) & (f >= -ON_EDGE) & (f <= 1.0 + ON_EDGE), t, np.inf))
    return found
