"""Does the heat balance close?"""

import numpy as np

from fem.checks.facts import Facts
from fem.results.findings import Finding
from fem.results.ledger import Ledger
from fem.solve.run import Run

CLOSES = 1e-6
"""Part of the heat turned over that may stay unexplained. The discrete balance is exact but for what Newton's method leaves."""


def ledger_of(run: Run, faces: tuple[str, ...], regions: tuple[str, ...], sources: tuple[bool, ...]) -> Ledger:
    """Return the heat ledger of one run."""
    moved = 0.0
    for kind in ("heat", "made", "stored"):
        rows = [i for i, key in enumerate(run.history.keys) if key.kind == kind]
        total = float(np.abs(run.history.v1[rows] - run.history.v0[rows]).sum())
        moved = max(moved, total) if kind == "stored" else moved + total
    moved = max(moved, float(np.abs(run.face_heat).sum() + np.abs(run.made).sum()), run.exchanged)
    made = tuple((name, float(heat)) for name, heat, has in zip(regions, run.made, sources, strict=True) if has)
    through = tuple((name, float(heat)) for name, heat in zip(faces, run.face_heat, strict=True))
    unexplained = float(run.face_heat.sum() + run.made.sum() - run.stored)
    return Ledger(through, made, run.stored, unexplained, moved)


def facts_ledger(facts: Facts) -> Ledger:
    """Return the ledger of the finest run."""
    faces = tuple(f"{face.name} on {face.edge}" for face in facts.problem.faces)
    run = facts.study.finest
    return ledger_of(run, faces, run.mesh.plan.region_names, tuple(law is not None for law in facts.problem.source))


def check(facts: Facts) -> list[Finding]:
    """Report heat that appears or vanishes."""
    ledger = facts_ledger(facts)
    if ledger.part <= CLOSES:
        return []
    return [
        Finding(
            "ledger",
            f"the heat ledger does not close: {ledger.unexplained:.3g} J of {ledger.turned_over:.3g} J turned over "
            f"({100 * ledger.part:.2g} %) is unexplained; {100 * CLOSES:.2g} % is allowed",
            "ask for a narrower band, which also tightens the solution of each step",
            blocks=True,
        )
    ]
