"""Was any stock used outside the range in which its values are stated?"""

import numpy as np

from fem.checks.facts import Facts, RegionStock
from fem.results.findings import Finding

ROUNDING = 1e-6


def check(facts: Facts) -> list[Finding]:
    """Report the highest excursion of each region."""
    run, names = facts.study.finest, facts.names
    found = []
    for index, stock in enumerate(facts.stocks):
        nodes = np.unique(run.mesh.cells[run.mesh.region == index])
        if stock.high == np.inf:
            found.append(_without_range(stock))
            continue
        hot, cold = nodes[np.argmax(run.peak[nodes])], nodes[np.argmin(run.low[nodes])]
        for node, T, excess, end in (
            (hot, run.peak[hot], run.peak[hot] - stock.high, stock.high),
            (cold, run.low[cold], stock.low - run.low[cold], stock.low),
        ):
            if excess > ROUNDING:
                x, y = run.mesh.points[node]
                found.append(
                    Finding(
                        "stock range",
                        f'region "{stock.region}" reaches {names.temperature(T)} at {names.place(x, y)}, '
                        f'but the values of "{stock.stock}" are stated only to {names.temperature(end)} '
                        f"({names.difference(excess)} outside)",
                        f'give "{stock.stock}" values for that range, or a stock that has them',
                        float(x),
                        float(y),
                        blocks=True,
                    )
                )
    return found


def _without_range(stock: RegionStock) -> Finding:
    return Finding(
        "stock range",
        f'"{stock.stock}" in region "{stock.region}" does not say in which range its values hold: nothing was checked against it',
    )
