"""In which region of a plan a point lies: exact, without a mesh."""

import numpy as np

from fem.section.build import Plan
from fem.section.edge import Edge, winding

ON_BORDER = 1e-9
"""A point nearer to a curve than this part of the section's size lies on it: rounding of the coordinates."""


def regions_at(plan: Plan, x: float, y: float) -> tuple[tuple[str, ...], bool]:
    """Return the regions at a point [m] (none outside the section), and whether it lies on a border of theirs."""
    z = np.array([complex(x, y)])
    for curve in plan.curves:
        if curve.edge.distance(z)[0] <= ON_BORDER * plan.size:
            return tuple(plan.region_names[i] for i in sorted({curve.left, curve.right}) if i >= 0), True
    for face in plan.faces:
        loops = [[_directed(plan, i, forward=forward) for i, forward in loop] for loop in face.loops]
        if sum(int(winding(loop, z)[0]) for loop in loops) > 0:
            return (plan.region_names[face.region],), False
    return (), False


def _directed(plan: Plan, i: int, *, forward: bool) -> Edge:
    edge = plan.curves[i].edge
    return edge if forward else edge.reversed()
