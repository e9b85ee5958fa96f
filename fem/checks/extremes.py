"""Does any temperature leave what the data allow?

Maximum principle of the heat equation (e.g. Evans, Partial Differential Equations, 2nd ed., sec. 2.3.3): without heat made and without
prescribed flux, no temperature lies outside the range of the start, the held temperatures, the ambients and the surroundings.
Heat made or flux into the section lifts the upper bound only, heat taken out the lower bound only.
"""

import numpy as np
from numpy.typing import NDArray

from fem.checks.facts import Facts
from fem.laws import Law
from fem.results.findings import Finding
from fem.results.history import TEMPERATURES
from fem.solve.problem import Face

Floats = NDArray[np.float64]

SAMPLES = 8  # per step
MATTERS = 0.1
"""An excursion is a doubt from this part of the narrowest wanted band on; below it, it is an error like any other inside the bands."""


def check(facts: Facts) -> list[Finding]:
    """Report the largest excursion above and below."""
    run, names = facts.study.finest, facts.names
    low, high, slack = bounds(facts)
    found = []
    hot, cold = int(np.argmax(run.peak)), int(np.argmin(run.low))
    for excess, node, word in (
        (run.peak[hot] - high, hot, "above the highest"),
        (low - run.low[cold], cold, "below the lowest"),
    ):
        if excess > slack:
            x, y = run.mesh.points[node]
            found.append(
                Finding(
                    "extremes",
                    f"a temperature at {names.place(x, y)} lies {names.difference(excess)} {word} that the data allow",
                    "refine the mesh there; if it stays, a property or an exposure is not what was meant",
                    float(x),
                    float(y),
                    blocks=True,
                )
            )
    return found


def bounds(facts: Facts) -> tuple[float, float, float]:
    """Return the lowest and highest temperature that the data allow, and the slack of that statement, K."""
    problem, run = facts.problem, facts.study.finest
    times = _times(facts)
    lows, highs = [np.min(run.start)], [np.max(run.start)]
    slack = MATTERS * min((g.wanted for g in facts.goals if g.key.kind in TEMPERATURES), default=1.0)
    heated = cooled = False
    for face in problem.faces:
        x, y = _places(facts, face)
        for law in _offers(face):
            values = _values(law, times, x, y)
            lows.append(values.min())
            highs.append(values.max())
            half = values[::2]  # how much a sampled extreme of a smooth law may miss
            slack = max(slack, 2.0 * (values.max() - half.max()), 2.0 * (half.min() - values.min()))
        for flux in face.fluxes:
            q = _values(flux, times, x, y)
            heated, cooled = heated or bool(q.max() > 0), cooled or bool(q.min() < 0)
    for region, source in enumerate(problem.source):
        if source is not None:
            nodes = np.unique(run.mesh.cells[run.mesh.region == region])
            q = _values(source, times[:: max(1, len(times) // 200)], *run.mesh.points[nodes].T)
            heated, cooled = heated or bool(q.max() > 0), cooled or bool(q.min() < 0)
    return -np.inf if cooled else float(min(lows)), np.inf if heated else float(max(highs)), slack


def _offers(face: Face) -> list[Law]:
    held = [] if face.held is None else [face.held]
    return held + [film.ambient for film in face.films] + [radiant.surroundings for radiant in face.radiants]


def _times(facts: Facts) -> Floats:
    if facts.problem.steady:
        return np.array([0.0])
    edges = facts.study.finest.steps.times
    inner = np.linspace(0.0, 1.0, SAMPLES, endpoint=False)[None, :] * np.diff(edges)[:, None] + edges[:-1, None]
    last = edges[-1] - 1e-9 * (edges[-1] - edges[-2])
    ends = edges[1:] - 1e-9 * np.diff(edges)  # the value before a jump counts too
    return np.concatenate((inner.ravel(), ends, [last]))


def _places(facts: Facts, face: Face) -> tuple[Floats, Floats]:
    mesh = facts.study.finest.mesh
    nodes = np.unique(mesh.facets[np.isin(mesh.curve, face.curves)])
    return mesh.points[nodes, 0], mesh.points[nodes, 1]


def _values(law: Law, times: Floats, x: Floats, y: Floats) -> Floats:
    if not law.needs & {"x", "y", "T"}:
        return np.array([float(law(t=t)) for t in times]) if "t" in law.needs else np.array([float(law())])
    instants = times if "t" in law.needs else times[:1]
    return np.array([np.broadcast_to(law(t=t, x=x, y=y, T=293.15), x.shape) for t in instants])
