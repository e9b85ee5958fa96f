"""From a judged study to the record that is kept."""

import platform
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version

import numpy as np

from fem.checks.ledger import ledger_of
from fem.docket import Docket
from fem.docket.content import content_hash, is_shelvable
from fem.docket.file import to_text
from fem.earn.judge import WANTED, Judgement, too_wide
from fem.results.record import Fields, Reason, Record, RecordMesh, TurnNote
from fem.results.verdicts import Call
from fem.runs.doubt import map_doubt
from fem.runs.study import Study
from fem.solve.march import Outcome
from fem.solve.problem import Problem

CROWDED = 300
"""Breaks from which on landing on each of them, not the error, decides the number of steps; our own judgement."""
LIBRARIES = ("heatvouch", "numpy", "scipy", "scikit-fem", "pygmsh", "gmsh", "cvxopt")


def reasons_of(judgement: Judgement, outcome: str, kind: str, *, banded: bool, breaks: int = 0) -> tuple[Reason, ...]:
    """Return why the standing is open; empty when nothing is left to close. `banded`: the study had three meshes; `breaks`: to land on."""
    reasons = []
    if kind == "quick look":
        reasons.append(Reason("a quick look makes no claim: one run on one mesh has no band", "vouch for it"))
    if outcome != Outcome.finished.value:
        close = "run it again, with a larger allowance if that ended it"
        if breaks > CROWDED:
            close += f"; or thin the logs: each of {breaks} kinks and jumps is landed on (thin = 1 drops rows within 1 of the line)"
        reasons.append(Reason(f"the work did not finish: {outcome}", close))
    if not banded:  # without three meshes there is no band, and so nothing that a band could show
        return tuple(
            reasons + [Reason(f.message, f.close) for f in judgement.findings if f.blocks and f.check != "outcome"]
        )
    for verdict in judgement.verdicts:
        if verdict.call is Call.too_close:
            reasons.append(
                Reason(
                    f'limit "{verdict.limit}" is too close to call: the band straddles it',
                    "a larger allowance, or a design with more margin",
                )
            )
    for need in judgement.needs:
        if need.total > 1.0 and need.goal.why == WANTED:
            text = f"{too_wide(need.goal.key)}: its band is {need.total:.2g} times the wanted one"
            reasons.append(Reason(text, "a larger allowance (cells, seconds), or a wider wanted band"))
    reasons += [Reason(f.message, f.close) for f in judgement.findings if f.blocks]
    return tuple(reasons)


def record_of(
    docket: Docket,
    problem: Problem,
    study: Study,
    judgement: Judgement,
    *,
    kind: str,
    outcome: str,
    turns: tuple[TurnNote, ...],
    seconds: float,
) -> Record:
    """Return the record of a study."""
    finest = study.finest
    reasons = reasons_of(judgement, outcome, kind, banded=len(study.levels) >= 3, breaks=len(problem.breaks()))
    faces = tuple(f"{face.name} on {face.edge}" for face in problem.faces)
    ledger = ledger_of(finest, faces, finest.mesh.plan.region_names, tuple(law is not None for law in problem.source))
    return Record(
        kind=kind,
        title=docket.title,
        content_hash=content_hash(docket),
        created=datetime.now(UTC).isoformat(timespec="seconds"),
        shelvable=is_shelvable(docket),
        versions=versions(),
        docket_text=to_text(docket) if is_shelvable(docket) else "",
        units=(docket.units.length, docket.units.time, docket.units.temperature),
        steady=problem.steady,
        revolution=problem.revolution,
        outcome=outcome,
        standing="open" if reasons else "vouched",
        reasons=reasons,
        turns=turns,
        figures=judgement.figures,
        verdicts=judgement.verdicts,
        findings=judgement.findings,
        ledger=ledger,
        mesh=_mesh(study),
        fields=_fields(study),
        facts=_facts(study),
        seconds=seconds,
    )


def versions() -> dict[str, str]:
    """Return the versions of all that a number rests on."""
    found = {"python": platform.python_version()}
    for name in LIBRARIES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:  # run from a source tree that is not installed
            found[name] = "not installed"
    return found


def _mesh(study: Study) -> RecordMesh:
    mesh = study.finest.mesh
    labels = tuple(", ".join(sorted(mesh.plan.curves[c].labels)) for c in mesh.curve)
    return RecordMesh(mesh.points, mesh.cells, mesh.region, mesh.plan.region_names, mesh.facets, labels)


def _fields(study: Study) -> Fields:
    run = study.finest
    doubt = np.full(len(run.mesh.cells), np.nan)
    if len(study.levels) >= 3:
        doubt = np.tile(map_doubt(study), 4)  # the children of cell i are i, i + M, i + 2M, i + 3M
    return Fields(run.frame_times, run.frames, run.peak, run.low, run.peak_time, doubt)


def _facts(study: Study) -> dict[str, object]:
    return {
        "cells": [len(r.mesh.cells) for r in study.levels],
        "nodes": [len(r.mesh.points) for r in study.levels],
        "steps": [len(r.steps) for r in study.levels],
        "time study steps": [len(r.steps) for r in study.timing],
        "factorizations": [r.factorizations for r in study.levels],
        "seconds": [round(r.seconds, 4) for r in study.levels],
        "smallest cell": float(study.finest.mesh.h.min()),
        "largest cell": float(study.finest.mesh.h.max()),
    }
