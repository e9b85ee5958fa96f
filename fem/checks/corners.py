"""Where do the equations have no finite answer, or converge slowly however fine the mesh?

Near a re-entrant corner of interior angle omega the temperature behaves as r**(pi/omega) (Grisvard, Elliptic Problems in Nonsmooth Domains,
1985): it is finite but its gradient, and so the heat flux density and the heating rate at the point, is not. Where two faces held
at different temperatures meet, the heat through either grows without bound as the mesh is refined.
"""

import numpy as np
from numpy.typing import NDArray

from fem.checks.facts import Facts
from fem.results.findings import Finding
from fem.runs.doubt import node_doubt

Floats = NDArray[np.float64]

REENTRANT = np.deg2rad(190.0)


def check(facts: Facts) -> list[Finding]:
    """Report re-entrant corners with the doubt at them, and corners where different held temperatures meet."""
    return _reentrant(facts) + _held_jumps(facts)


def _reentrant(facts: Facts) -> list[Finding]:
    if len(facts.study.levels) < 3:
        return []
    wanted = min(
        (goal.wanted for goal in facts.goals if goal.key.kind in ("gauge", "highest", "lowest")), default=np.inf
    )
    middle = facts.study.levels[-2].mesh
    doubt = node_doubt(facts.study)
    found = []
    for node, angle in reentrant_nodes(facts):
        near = float(doubt[node])
        if near <= wanted:
            continue
        x, y = middle.points[node]
        found.append(
            Finding(
                "corner",
                f"re-entrant corner of {np.rad2deg(angle):.0f} degrees at {facts.names.place(x, y)}: the two finest meshes differ by up to "
                f"{facts.names.difference(near)} at it; "
                "the heat flux density at the point itself has no finite value, and so no band",
                "",
                float(x),
                float(y),
                blocks=False,
            )
        )
    return found


def reentrant_nodes(facts: Facts) -> list[tuple[int, float]]:
    """Return the section's corners with more than 190 degrees of material, as (node of the first mesh, angle in rad)."""
    mesh = facts.study.levels[0].mesh
    p = mesh.points[mesh.cells]
    ahead, behind = np.roll(p, -1, axis=1) - p, np.roll(p, 1, axis=1) - p
    cosine = (ahead * behind).sum(axis=2) / (np.linalg.norm(ahead, axis=2) * np.linalg.norm(behind, axis=2))
    angle = np.bincount(
        mesh.cells.ravel(), weights=np.arccos(np.clip(cosine, -1.0, 1.0)).ravel(), minlength=len(mesh.points)
    )
    corners = _vertices(facts)
    return [(int(n), float(angle[n])) for n in corners if REENTRANT < angle[n] < 2.0 * np.pi - 1e-6]


def _vertices(facts: Facts) -> NDArray[np.intp]:
    """Return the nodes at which outside curves end."""
    mesh = facts.study.levels[0].mesh
    outside = mesh.facets[mesh.outer]
    ends = [end for c in mesh.plan.curves if min(c.left, c.right) < 0 for end in (c.start, c.end)]
    nodes = np.unique(outside)
    if not ends:
        return nodes[:0]
    gap = np.linalg.norm(mesh.points[nodes][:, None, :] - np.array(ends)[None, :, :], axis=2).min(axis=1)
    return np.asarray(nodes[gap < 1e-9 * np.ptp(mesh.points, axis=0).max()])


def _held_jumps(facts: Facts) -> list[Finding]:
    mesh, found = facts.study.levels[0].mesh, []
    held = [face for face in facts.problem.faces if face.held is not None]
    t = 0.5 * ((facts.problem.begin or 0.0) + (facts.problem.end or 0.0))
    for i, one in enumerate(held):
        for other in held[i + 1 :]:
            nodes, others = (np.unique(mesh.facets[np.isin(mesh.curve, f.curves)]) for f in (one, other))
            shared = np.intersect1d(nodes, others)
            for node in shared:
                x, y = mesh.points[node]
                a, b = (float(f.held(t=t, x=x, y=y)) for f in (one, other) if f.held is not None)
                if abs(a - b) > 1e-9 * max(abs(a), abs(b)):
                    found.append(_jump_finding(facts, (one.name, other.name), (float(x), float(y)), abs(a - b)))
    return found


def _jump_finding(facts: Facts, faces: tuple[str, str], place: tuple[float, float], gap: float) -> Finding:
    asked = {goal.key.name.split(" on ")[0] for goal in facts.goals if goal.key.kind in ("flow", "heat")}
    return Finding(
        "corner",
        f"held temperatures that differ by {facts.names.difference(gap)} meet at {facts.names.place(*place)}: "
        f'the heat through "{faces[0]}" and "{faces[1]}" has no finite value there, and so no band',
        "put a film, or a ramp of the held temperature, between them",
        *place,
        blocks=bool(asked & set(faces)),
    )
