"""The main path: run on three meshes and three step sizes, judge, refine what owes most, and go on until it is settled.

docket -> plan -> mesh -> study -> judgement -> turn -> ... -> record
"""

import time
from collections.abc import Callable

from threadpoolctl import threadpool_limits

from fem.docket import Docket
from fem.judge import Judgement, judge
from fem.march import Outcome
from fem.mesh import make_mesh
from fem.pose import Posed, pose
from fem.record import Record, TurnNote
from fem.recording import record_of
from fem.study import Bench, Progress, Stopped, Study
from fem.tell import found_text
from fem.turns import Turn, Turner, take

OnProgress = Callable[[Progress], None]
OnTurn = Callable[[TurnNote], None]
Stop = Callable[[], bool]

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
        turner = Turner(docket.allowance, began)
        notes: list[TurnNote] = []
        try:
            study = bench.first(make_mesh(posed.plan, gauges=posed.gauges.points))
        except Stopped as stopped:
            return _unfinished(posed, stopped, began, "vouch")
        outcome = Outcome.finished.value
        while True:
            judgement = _judge(posed, study)
            turn = turner.next(study, judgement, bench, found_text(judgement, posed.names))
            notes.append(_note(turn, study, began))
            if on_turn is not None:
                on_turn(notes[-1])
            if turn.todo in ("settled", "spent"):
                break
            try:
                study = take(turn, study, bench)
            except Stopped as stopped:
                # The last whole study stands; only the turn that was under way is lost.
                outcome = "interrupted" if stopped.why == "interrupted" else outcome
                break
        if not study.finished:
            outcome = next(r.outcome.value for r in study.runs if r.outcome is not Outcome.finished)
        return _record(posed, study, judgement, "vouch", outcome, tuple(notes), began)


def look(docket: Docket, *, on_progress: OnProgress | None = None, stop: Stop | None = None) -> Record:
    """Return a quick look: one run on one mesh, no claim. Parameters and errors as for `vouch`."""
    began = time.perf_counter()
    with threadpool_limits(1):
        posed = pose(docket)
        bench = _bench(posed, on_progress, stop, began + docket.allowance.seconds)
        try:
            study = bench.look(make_mesh(posed.plan, gauges=posed.gauges.points))
        except Stopped as stopped:
            return _unfinished(posed, stopped, began, "quick look")
        return _record(posed, study, _judge(posed, study), "quick look", study.finest.outcome.value, (), began)


def _bench(posed: Posed, on_progress: OnProgress | None, stop: Stop | None, deadline: float) -> Bench:
    tolerance = STEP_PART * posed.narrowest
    return Bench(
        posed.problem, posed.gauges, tolerance=tolerance, deadline=deadline, on_progress=on_progress, stop=stop
    )


def _judge(posed: Posed, study: Study) -> Judgement:
    return judge(posed.docket, study, posed.problem, posed.gauges, posed.stocks, posed.names)


def _note(turn: Turn, study: Study, began: float) -> TurnNote:
    finest = study.finest
    return TurnNote(turn.found, turn.then, len(finest.mesh.cells), len(finest.steps), time.perf_counter() - began)


def _unfinished(posed: Posed, stopped: Stopped, began: float, kind: str) -> Record:
    """Return the record of the first run that was under way: it has no band, and says how far it came."""
    why = "interrupted" if stopped.why == "interrupted" else "the allowance of seconds ran out in the first study"
    study = Study((stopped.partial,), (), ())
    return _record(posed, study, _judge(posed, study), kind, why, (), began)


def _record(
    posed: Posed, study: Study, judgement: Judgement, kind: str, outcome: str, notes: tuple[TurnNote, ...], began: float
) -> Record:
    seconds = time.perf_counter() - began
    return record_of(
        posed.docket, posed.problem, study, judgement, kind=kind, outcome=outcome, turns=notes, seconds=seconds
    )
