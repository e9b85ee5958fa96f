"""Checks of a study: one file each, one signature, `check(facts) -> list of Finding`. Each can fire, and a test shows it firing."""

from collections.abc import Callable

from fem.checks import corners, extremes, first_transient, ledger, mesh_quality, order, outcome, pieces, stock_range
from fem.checks.facts import Facts
from fem.results.findings import Finding

CHECKS: tuple[Callable[[Facts], list[Finding]], ...] = (
    outcome.check,
    ledger.check,
    extremes.check,
    stock_range.check,
    order.check,
    first_transient.check,
    corners.check,
    pieces.check,
    mesh_quality.check,
)


def check_all(facts: Facts) -> tuple[Finding, ...]:
    """Return the findings of every check, those that block the standing first."""
    found = [finding for check in CHECKS for finding in check(facts)]
    return tuple(sorted(found, key=lambda finding: not finding.blocks))
