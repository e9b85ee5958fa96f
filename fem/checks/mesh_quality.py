"""Are the cells fit for the maximum principle?"""

import numpy as np

from fem.checks.facts import Facts
from fem.results.findings import Finding
from fem.solve.assembly import Assembly

FLATTEST = 10.0
"""Degrees; below it interpolation constants grow beyond about six times those of the equilateral cell (1/sin of the angle)."""


def check(facts: Facts) -> list[Finding]:
    """Report flat cells, and pairs of nodes between which the discrete heat flow has the wrong sign."""
    mesh, names = facts.study.finest.mesh, facts.names
    angle = smallest_angles(mesh.points[mesh.cells])
    found = []
    worst = int(np.argmin(angle))
    if angle[worst] < FLATTEST:
        x, y = mesh.points[mesh.cells[worst]].mean(axis=0)
        found.append(
            Finding(
                "mesh",
                f"flat cells: the smallest angle is {angle[worst]:.1f} degrees at {names.place(x, y)} (wanted: {FLATTEST:.0f} or more)",
                "",
                float(x),
                float(y),
                blocks=False,
            )
        )
    part = wrong_sign_part(facts)
    if part > 0.01:
        found.append(
            Finding(
                "mesh",
                f"{100 * part:.1f} % of the couplings between nodes have the wrong sign (obtuse cells); "
                f"the check of extremes watches what that can do",
                blocks=False,
            )
        )
    return found


def smallest_angles(corners: np.ndarray) -> np.ndarray:
    """Return the smallest angle of triangles (M, 3, 2), degrees, shape (M,)."""
    a = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2)
    b, c = np.roll(a, 1, axis=1), np.roll(a, 2, axis=1)
    cosine = (b**2 + c**2 - a**2) / (2.0 * b * c)
    return np.asarray(np.rad2deg(np.arccos(np.clip(cosine, -1.0, 1.0))).min(axis=1))


def wrong_sign_part(facts: Facts) -> float:
    """Return the part of off-diagonal entries of the conduction matrix that are positive beyond rounding."""
    assembly = Assembly(facts.study.levels[0].mesh, revolution=facts.problem.revolution)
    K = assembly.stiffness(np.ones(len(facts.study.levels[0].mesh.cells)))
    rows = np.repeat(np.arange(assembly.n), np.diff(K.indptr))
    off = K.data[rows != K.indices]
    return float(np.mean(off > 1e-9 * np.abs(off).max()))
