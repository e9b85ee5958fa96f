"""Pieces of a section: regions that exchange heat with each other through what touches."""

from fem.section.plan import Plan


def pieces(plan: Plan) -> tuple[tuple[str, ...], ...]:
    """Return the names of the regions of each piece; one piece when everything touches along some curve."""
    group = list(range(len(plan.region_names)))
    for curve in plan.curves:
        if curve.left >= 0 and curve.right >= 0:
            old, new = group[curve.left], group[curve.right]
            group = [new if g == old else g for g in group]
    return tuple(
        tuple(n for n, g in zip(plan.region_names, group, strict=True) if g == k) for k in dict.fromkeys(group)
    )
