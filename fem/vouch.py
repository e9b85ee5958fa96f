"""The main path: run on three meshes and three step sizes, judge, refine what owes most, and go on until it is settled.

docket -> plan -> mesh -> study -> judgement -> turn -> ... -> record
"""

import time
from collections.abc import Callable

import numpy as np
from threadpoolctl import threadpool_limits

from fem.docket import Docket
from fem.earn.judge import Judgement, judge
from fem.earn.pose import Posed, pose
from fem.earn.recording import record_of
from fem.earn.tell import found_text
from fem.earn.turns import Turner, take
from fem.mesh.make import make_mesh
from fem.results.record import Record, TurnNote
from fem.runs.study import Bench, Progress, Stopped, Study, TooDear
from fem.solve.march import Outcome
from fem.solve.run import Run

OnProgress = Callable[[Progress], None]
OnTurn = Callable[[TurnNote], None]
Stop = Callable[[], bool]

THREE_MESHES = 16
"""Cells of the finest of three meshes over those of the first."""
FIRST_MESHES = (1.0, 0.5)
"""Finenesses of the first mesh, the usual one first."""
STEP_PART = 0.2
"""Local error per step as a part of the narrowest wanted band: the time part then stays well below the space part."""


def vouch(
    docket: Docket, *, on_progress: OnProgress | None = None, on_turn: OnTurn | None = None, stop: Stop | None = None
) -> Record:
    """Earn the docket's numbers: a record with a band on each, and a standing.

    Parameters
    ----------
    docket : Docket
        What is asked.
    on_progress, on_turn : callable, optional
        Told how far the work is, and what each turn found and does next.
    stop : callable, optional
        Asked after every step; True ends the work. What was earned by then is kept, and the record says so.

    Raises
    ------
    DocketError
        If the section, the exposures or the gauges have no meaning.
    """
    began = time.perf_counter()
    with threadpool_limits(1):  # small blocks: more threads only wait for each other
        posed = pose(docket)
        bench = _bench(posed, on_progress, stop, began + docket.allowance.seconds)
        notes = _Notes(began, on_turn)
        try:
            study = _first_study(posed, bench, notes)
        except Stopped as stopped:
            return _unfinished(posed, stopped, notes)
        study, judgement, outcome = _earn(posed, bench, study, notes)
        return _record(posed, study, judgement, "vouch", outcome, notes)


def _earn(posed: Posed, bench: Bench, study: Study, notes: "_Notes") -> tuple[Study, Judgement, str]:
    """Judge and refine, turn after turn, until it is settled or the allowance is spent."""
    turner = Turner(posed.docket.allowance, notes.began)
    while True:
        judgement = _judge(posed, study)
        turn = turner.next(study, judgement, bench, found_text(judgement, posed.names))
        notes.add(turn.found, turn.then, study.finest)
        if turn.todo in ("settled", "spent"):
            break
        try:
            study = take(turn, study, bench)
        except Stopped as stopped:
            if stopped.why == "interrupted":
                return study, judgement, "interrupted"
            break  # the last whole study stands; only the turn that was under way is lost
    unfinished = [r.outcome.value for r in study.runs if r.outcome is not Outcome.finished]
    return study, judgement, (unfinished or [study_outcome(study, posed.docket)])[0]


def study_outcome(study: Study, docket: Docket) -> str:
    """Return "finished", or that the allowance held no three meshes."""
    if len(study.levels) >= 3:
        return Outcome.finished.value
    needed = THREE_MESHES * len(study.finest.mesh.cells)
    return f"three meshes would need {needed} cells on the finest, the allowance is {docket.allowance.cells}"


def _first_study(posed: Posed, bench: Bench, notes: "_Notes") -> Study:
    """Return the first study, from a coarser first mesh where the allowance asks for it; one run alone where nothing fits.

    The usual first mesh has four cells across every part, the coarser one two, so that the second has four.
    """
    allowance = posed.docket.allowance
    for finer in FIRST_MESHES:
        mesh = make_mesh(posed.plan, gauges=posed.gauges.points, finer=finer)
        last = finer == FIRST_MESHES[-1]
        cells = THREE_MESHES * len(mesh.cells)
        try:
            if cells > allowance.cells:
                raise TooDear(f"{cells} cells")
            left = allowance.seconds - (time.perf_counter() - notes.began)
            return bench.first(mesh, most_seconds=np.inf if last else left)
        except TooDear as dear:
            then = "one run alone, without a band" if last else "begin with half as many cells across each part"
            notes.add(
                f"three meshes from a first one of {len(mesh.cells)} cells need {dear}: more than the allowance",
                then,
                None,
            )
    return bench.look(mesh)


def look(docket: Docket, *, on_progress: OnProgress | None = None, stop: Stop | None = None) -> Record:
    """Return a quick look: one run on one mesh, no claim. Parameters and errors as for `vouch`."""
    began = time.perf_counter()
    with threadpool_limits(1):
        posed = pose(docket)
        bench = _bench(posed, on_progress, stop, began + docket.allowance.seconds)
        notes = _Notes(began)
        try:
            study = bench.look(make_mesh(posed.plan, gauges=posed.gauges.points))
        except Stopped as stopped:
            return _unfinished(posed, stopped, notes, "quick look")
        return _record(posed, study, _judge(posed, study), "quick look", study.finest.outcome.value, notes)


def _bench(posed: Posed, on_progress: OnProgress | None, stop: Stop | None, deadline: float) -> Bench:
    tolerance = STEP_PART * posed.narrowest
    return Bench(
        posed.problem, posed.gauges, tolerance=tolerance, deadline=deadline, on_progress=on_progress, stop=stop
    )


def _judge(posed: Posed, study: Study) -> Judgement:
    return judge(posed.docket, study, posed.problem, posed.gauges, posed.stocks, posed.names)


class _Notes:
    """The turns as told to the user, and the clock of the whole work."""

    def __init__(self, began: float, on_turn: OnTurn | None = None) -> None:
        self.began, self._on_turn = began, on_turn
        self.turns: list[TurnNote] = []

    @property
    def seconds(self) -> float:
        """Return the seconds since the work began."""
        return time.perf_counter() - self.began

    def add(self, found: str, then: str, finest: Run | None) -> None:
        """Note and tell a turn."""
        cells, steps = (0, 0) if finest is None else (len(finest.mesh.cells), len(finest.steps))
        self.turns.append(TurnNote(found, then, cells, steps, self.seconds))
        if self._on_turn is not None:
            self._on_turn(self.turns[-1])


def _unfinished(posed: Posed, stopped: Stopped, notes: _Notes, kind: str = "vouch") -> Record:
    """Return the record of a first study that was stopped: the finest run that reached its end, or the one under way; no band."""
    why = "interrupted" if stopped.why == "interrupted" else "the allowance of seconds ran out in the first study"
    study = Study((stopped.partial,), (), ())
    return _record(posed, study, _judge(posed, study), kind, why, notes)


def _record(posed: Posed, study: Study, judgement: Judgement, kind: str, outcome: str, notes: _Notes) -> Record:
    return record_of(
        posed.docket, posed.problem, study, judgement,
        kind=kind, outcome=outcome, turns=tuple(notes.turns), seconds=notes.seconds,
    )  # fmt: skip
