"""Is the first moment after a jump of data resolved at the gauges?"""

import numpy as np

from fem.checks.facts import Facts
from fem.mesh.locate import interpolation
from fem.results.findings import Finding


def check(facts: Facts) -> list[Finding]:
    """Report gauges that are read while alpha tau / h^2 < 1, tau = time since the last jump, h and alpha of the cell at the gauge.

    Before that the heat has not crossed one cell, and no mesh of that size can follow it.
    """
    if facts.problem.steady or len(facts.study.levels) < 3:
        return []
    grid, found = facts.figures.grid, []
    tau = (grid.t - grid.origin)[grid.reported]
    for name, needed in zip(facts.gauges.names, resolved_after(facts), strict=True):
        early = tau < needed
        if early.any():
            when = facts.names.time(needed)
            found.append(
                Finding(
                    "first transient",
                    f'gauge "{name}": unresolved first transient, the mesh follows it from {when} after a jump of data; '
                    f"{int(early.sum())} reported values lie before that and rest on their band alone",
                    blocks=False,
                )
            )
    return found


def resolved_after(facts: Facts) -> np.ndarray:
    """Return h^2/alpha at each gauge on the finest mesh, s, shape (n_gauges,)."""
    mesh, problem, run = facts.study.finest.mesh, facts.problem, facts.study.finest
    probe = interpolation(mesh, facts.gauges.points)
    needed = np.empty(len(facts.gauges.names))
    for i in range(len(needed)):
        nodes = probe.indices[probe.indptr[i] : probe.indptr[i + 1]]
        cell = int(np.argmax(np.isin(mesh.cells, nodes).sum(axis=1)))
        x, y = facts.gauges.points[i]
        T = run.start[mesh.cells[cell]].mean()
        r = mesh.region[cell]
        alpha = problem.conductivity[r](t=problem.begin, x=x, y=y, T=T) / problem.heat_capacity[r](x=x, y=y, T=T)
        needed[i] = mesh.h[cell] ** 2 / float(alpha)
    return needed
