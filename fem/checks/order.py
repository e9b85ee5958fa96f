"""Do the errors fall as theory says they must?"""

import numpy as np

from fem.checks.facts import Facts
from fem.results.bands import ASYMPTOTIC, NARROWEST, ORDER_LOW
from fem.results.findings import Finding
from fem.results.history import Key

MATTERS = 0.1
"""An odd order is worth a word only where the band is more than this part of the wanted one."""


def check(facts: Facts) -> list[Finding]:
    """Report series whose observed order in space is below the asymptotic one where it matters.

    Below 0.5 the differences between meshes hardly shrink, and the band rests on no theory: that blocks the standing.
    """
    if len(facts.study.levels) < 3:
        return []
    figures, found = facts.figures, []
    floor: dict[Key, float] = {}  # a band that was only widened to what is the narrowest said shows no order
    for goal in facts.goals:
        floor[goal.key] = max(floor.get(goal.key, 0.0), NARROWEST * goal.wanted)
    for goal in facts.goals:
        i = figures.row(goal.key)
        relevant = goal.counts(figures) & (figures.space[i] > max(MATTERS * goal.wanted, floor[goal.key]))
        if not relevant.any():
            continue
        order = float(np.min(figures.order[i, relevant]))
        if order >= ASYMPTOTIC:
            continue
        when = float(figures.grid.t[relevant][np.argmin(figures.order[i, relevant])])
        blocks = order < ORDER_LOW
        found.append(
            Finding(
                "order",
                f"{goal.key.kind} {goal.key.name}: differences between meshes shrink by order {order:.2f} at {facts.names.time(when)} "
                f"(theory: 2 where the solution is smooth, less near re-entrant corners and right after jumps): not asymptotic"
                + ("; the band rests on no theory there" if blocks else "; the band is widened for it"),
                "more cells near it" if blocks else "",
                blocks=blocks,
            )
        )
    return found
