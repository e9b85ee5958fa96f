"""Nodes on the curves of a plan such that the chords between them cross nowhere."""

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from fem.errors import MeshError
from fem.section.edge import Complexes, Floats
from fem.section.plan import Curve

ROUNDS = 30
"""Each round halves chords; in a cusp between two arcs a few are needed."""


def clear_of_each_other(curves: Sequence[Curve], fractions: Sequence[Floats]) -> list[Floats]:
    """Return the fractions with chords of arcs halved until none crosses another one.

    Where two arcs leave a node along one tangent, or nearly touch, a long chord may cut through the other arc.

    Raises
    ------
    MeshError
        If chords still cross after `ROUNDS` halvings.
    """
    fractions = list(fractions)
    for _ in range(ROUNDS):
        curve, z = _chords(curves, fractions)
        crossing = _crossing(z)
        if not len(crossing):
            return fractions
        arcs = [k for k in crossing if curves[curve[k]].kind == "arc"]
        if not arcs:
            at = z[crossing[0]].mean()
            raise MeshError(f"two straight curves of the section cross at x = {at.real:.6g} m, y = {at.imag:.6g} m")
        long = np.zeros(len(curve), dtype=bool)
        long[arcs] = True
        fractions = halved(fractions, long)
    at = z[arcs[0]].mean()
    raise MeshError(
        f"arcs run too close to each other at x = {at.real:.6g} m, y = {at.imag:.6g} m to be followed by chords"
    )


def halved(fractions: Sequence[Floats], long: NDArray[np.bool_]) -> list[Floats]:
    """Return the fractions with a new one in the middle of each long chord; chords are counted curve after curve."""
    out, first = [], 0
    for f in fractions:
        mine = long[first : first + len(f) - 1]
        out.append(np.sort(np.concatenate((f, 0.5 * (f[:-1] + f[1:])[mine]))))
        first += len(f) - 1
    return out


def _chords(curves: Sequence[Curve], fractions: Sequence[Floats]) -> tuple[NDArray[np.int64], Complexes]:
    """Return the curve of every chord, and its ends (n, 2)."""
    curve = np.repeat(np.arange(len(fractions)), [len(f) - 1 for f in fractions])
    points = [c.edge.at(f) for c, f in zip(curves, fractions, strict=True)]
    ends = np.concatenate([np.column_stack((p[:-1], p[1:])) for p in points])
    return curve, ends


def _crossing(z: Complexes) -> NDArray[np.int64]:
    """Return the chords (n, 2) that meet another one elsewhere than at a common end."""
    lines = np.asarray(shapely.linestrings(np.stack((z.real, z.imag), axis=2)))
    one, other = shapely.STRtree(lines).query(lines, predicate="intersects")
    one, other = one[one < other], other[one < other]
    shared = (z[one][:, :, None] == z[other][:, None, :]).sum(axis=(1, 2))
    meet = shapely.intersection(lines[one], lines[other])
    at_end = (shared == 1) & (shapely.get_type_id(meet) == shapely.GeometryType.POINT)
    wrong = ~at_end
    return np.asarray(np.unique(np.concatenate((one[wrong], other[wrong]))))
