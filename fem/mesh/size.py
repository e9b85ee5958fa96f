"""How large a cell may be where: a part of the local thickness, 1/24 of a circle on arcs, growing slowly in between."""

import math
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fem.errors import MeshError
from fem.mesh.rays import hits
from fem.section.edge import Complexes, Edge, Floats
from fem.section.faces import sectors
from fem.section.plan import Plan

Ints = NDArray[np.int64]

AROUND = 24
"""Cells around a full circle: its chords then stay within 0.9 % of the radius of the arc."""
LARGEST = 0.1
"""Largest cell as a part of the section's size."""
GROWTH = 0.3
"""Growth of the cell size per distance: neighbouring cells differ by about this part."""
TIP = 0.3
"""Towards the tip of a wedge thickness counts as no less than this part of the wedge's greatest one: a tip has none."""
REENTRANT = math.radians(190.0)
FAN = math.radians(15.0)
"""From a re-entrant corner, thickness is looked for in directions this far apart."""
SPACING = 1.5
"""Samples on a curve are at most this many cell sizes apart."""
MOST_SAMPLES = 100_000
"""On all curves together; a mesh with more would have about a million cells before any refinement."""


class SizeField:
    """Wanted cell size anywhere in a plan.

    Parameters
    ----------
    plan : Plan
    across : int
        Cells wanted across each part.
    finer : float
        All sizes are divided by it.

    Raises
    ------
    MeshError
        If the mesh would be far too large.

    Attributes
    ----------
    z : (n,) complex
        Samples on the curves, m.
    size : (n,) float
        Wanted there, before `finer` divides it, m.
    """

    def __init__(self, plan: Plan, *, across: int, finer: float) -> None:
        self._plan, self._across, self._finer = plan, across, finer
        self._largest = LARGEST * plan.size
        self.nodes, self.links = plan.links()
        self._of_region = [
            [i for i, link in enumerate(self.links) if r in (link.left, link.right)]
            for r in range(len(plan.region_names))
        ]
        self._ends = np.array([(link.a, link.b) for link in self.links])
        self._widest: dict[tuple[int, int], float] = {}
        self._curve, self._f, z, size = self._along_curves()
        at_corners = self._at_corners()
        self.z, self.size = np.concatenate((z, at_corners[0])), np.concatenate((size, at_corners[1]))
        self._bins = _Bins(self.z, self.size, plan.size)

    def at(self, z: complex) -> float:
        """Return the wanted size at a point, m."""
        return min(self._largest, self._bins.smallest(z)) / self._finer

    def divided(self, curve: int, splits: Sequence[float]) -> Floats:
        """Return the fractions at which a curve gets nodes: 0, 1, the splits, and between them as many as wanted.

        Between two splits nodes are set at equal steps of the integral of ds/size.
        """
        edge = self.links[curve].edge
        mine = self._f[self._curve == curve]
        cuts = [0.0, *sorted(splits), 1.0]
        fractions = [np.zeros(1)]
        for start, end in pairwise(cuts):
            inner = mine[(mine > start) & (mine < end)]
            f = np.unique(np.concatenate(([start], inner, [0.5 * (start + end)], [end])))
            density = edge.length / np.array([self.at(complex(z)) for z in edge.at(f)])
            count = np.concatenate(([0.0], np.cumsum(0.5 * (density[1:] + density[:-1]) * np.diff(f))))
            bent = math.ceil(AROUND * self._finer * abs(edge.sweep) * (end - start) / (2.0 * math.pi) - 1e-9)
            pieces = max(1, bent, round(count[-1]))
            fractions.append(np.interp(np.linspace(0.0, count[-1], pieces + 1)[1:], count, f))
            fractions[-1][-1] = end
        return np.concatenate(fractions)

    def _along_curves(self) -> tuple[Ints, Floats, Complexes, Floats]:
        """Return curve, fraction, point and size of samples on all curves, so close that none misses a size."""
        curve = np.concatenate([np.full(self._first_count(link.edge), i) for i, link in enumerate(self.links)])
        f = np.concatenate([(np.arange(n) + 0.5) / n for n in (self._first_count(link.edge) for link in self.links)])
        z, size = self._sampled(curve, f)
        while True:
            order = np.lexsort((f, curve))
            curve, f, z, size = curve[order], f[order], z[order], size[order]
            more_curve, more_f = self._between(curve, f, size)
            if not len(more_f):
                break
            if len(f) + len(more_f) > MOST_SAMPLES:
                thin = z[int(np.argmin(size))]
                raise MeshError(
                    f"a part at x = {thin.real:.6g} m, y = {thin.imag:.6g} m is so thin for its length that {self._across} cells "
                    f"across it make about a million cells: leave it out, or give the stock beside it what it adds"
                )
            more_z, more_size = self._sampled(more_curve, more_f)
            curve, f = np.concatenate((curve, more_curve)), np.concatenate((f, more_f))
            z, size = np.concatenate((z, more_z)), np.concatenate((size, more_size))
        return curve, f, z, size

    def _between(self, curve: Ints, f: Floats, size: Floats) -> tuple[Ints, Floats]:
        """Return where samples, sorted along their curves, are too far from the next one or from their curve's end."""
        length = np.array([link.edge.length for link in self.links])[curve]
        reach = SPACING * size / length
        same = curve[1:] == curve[:-1]
        wide = np.flatnonzero(same & (f[1:] - f[:-1] > np.minimum(reach[1:], reach[:-1])))
        first = np.flatnonzero(np.concatenate(([True], ~same)) & (2.0 * f > reach))
        last = np.flatnonzero(np.concatenate((~same, [True])) & (2.0 * (1.0 - f) > reach))
        places = np.concatenate((0.5 * (f[wide] + f[wide + 1]), 0.5 * f[first], 0.5 * (1.0 + f[last])))
        return np.concatenate((curve[wide], curve[first], curve[last])), places

    @staticmethod
    def _first_count(edge: Edge) -> int:
        return max(5, math.ceil(AROUND * abs(edge.sweep) / (2.0 * math.pi)))

    def _sampled(self, curve: Ints, f: Floats) -> tuple[Complexes, Floats]:
        """Return the points at fractions of curves, and the sizes wanted there."""
        z, tangent, size = np.empty(len(f), complex), np.empty(len(f), complex), np.empty(len(f))
        for i in np.unique(curve):
            mine, edge = curve == i, self.links[i].edge
            z[mine], tangent[mine] = edge.at(f[mine]), edge.tangent(f[mine])
            bend = 2.0 * math.pi * edge.radius / AROUND if edge.centre is not None else np.inf
            size[mine] = min(self._largest, edge.length, bend)
        for sides, inward in (((link.left for link in self.links), 1j), ((link.right for link in self.links), -1j)):
            side = np.array(list(sides))[curve]
            for region, members in enumerate(self._of_region):
                mine = np.flatnonzero(side == region)
                if len(mine):
                    thickness, hit = hits(
                        z[mine], inward * tangent[mine], [self.links[m].edge for m in members], 1e-7 * self._plan.size
                    )
                    struck = np.array(members)[hit]
                    thickness = self._without_tips(curve[mine], struck, thickness)
                    size[mine] = np.minimum(size[mine], thickness / self._across)
        return z, size

    def _without_tips(self, curve: Ints, struck: Ints, thickness: Floats) -> Floats:
        """Return the thickness, held up where the ray crosses a wedge: where it strikes a curve that meets its own."""
        meets = (self._ends[curve][:, :, None] == self._ends[struck][:, None, :]).any(axis=(1, 2)) & (curve != struck)
        for i in np.flatnonzero(meets & np.isfinite(thickness)):
            pair = (int(curve[i]), int(struck[i]))
            self._widest[pair] = max(self._widest.get(pair, 0.0), float(thickness[i]))
        held = thickness.copy()
        for i in np.flatnonzero(meets):
            held[i] = max(thickness[i], TIP * self._widest.get((int(curve[i]), int(struck[i])), 0.0))
        return held

    def _at_corners(self) -> tuple[Complexes, Floats]:
        """Return samples at re-entrant corners, which no curve's normal need see."""
        z, size = [], []
        for sector in sectors(self.links, self.nodes):
            if sector.owner < 0 or sector.angle < REENTRANT:
                continue
            turn = np.arange(0.5 * math.pi, sector.angle - 0.5 * math.pi + 1e-9, FAN)
            start = np.full(len(turn), self.nodes[sector.node])
            members = self._of_region[sector.owner]
            thickness, _ = hits(
                start,
                np.exp(1j * (sector.begins + turn)),
                [self.links[m].edge for m in members],
                1e-7 * self._plan.size,
            )
            z.append(complex(self.nodes[sector.node]))
            size.append(float(thickness.min()) / self._across)
        return np.array(z, dtype=np.complex128), np.array(size)


class _Bins:
    """Answers min(size + GROWTH * distance) over the samples quickly.

    Each box of a raster keeps the samples that can give the smallest value somewhere in it.
    """

    def __init__(self, z: Complexes, size: Floats, extent: float) -> None:
        self._z, self._size = z, size
        self._box = extent / min(64, max(8, math.isqrt(len(z))))
        self._kept: dict[tuple[int, int], tuple[Complexes, Floats]] = {}

    def smallest(self, z: complex) -> float:
        """Return the size at a point."""
        box = (math.floor(z.real / self._box), math.floor(z.imag / self._box))
        kept = self._kept.get(box)
        if kept is None:
            kept = self._kept[box] = self._candidates(box)
        return float((kept[1] + GROWTH * np.abs(kept[0] - z)).min())

    def _candidates(self, box: tuple[int, int]) -> tuple[Complexes, Floats]:
        middle, reach = self._box * complex(box[0] + 0.5, box[1] + 0.5), self._box / math.sqrt(2.0)
        d = np.abs(self._z - middle)
        at_most = (self._size + GROWTH * (d + reach)).min()
        may = self._size + GROWTH * np.maximum(d - reach, 0.0) <= at_most
        return self._z[may], self._size[may]
