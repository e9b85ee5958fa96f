"""What to do next: split the cells or the steps that owe most, or stop, and why."""

import time
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from fem.docket import Allowance
from fem.earn.judge import Judgement, Need
from fem.mesh.make import Mesh
from fem.runs.doubt import cell_doubt, passes_needed, step_doubt
from fem.runs.study import Bench, Study, split_cells

AIM = 0.5
"""Cells are split until their doubt is this part of the wanted band: the doubt is about three times the error that it stands for."""
TIME_SHARE = 0.5
"""Steps are split first when the time part is more than this share of the band."""
BEYOND_REACH = "stop: a limit lies nearer to the number than a fiftieth of the wanted band; no mesh decides that"
WHOLE_STUDY = 27 / 16
"""Work of a whole study (three meshes, three step sequences) over that of its finest run."""


@dataclass(frozen=True)
class Turn:
    """One turn of a vouch.

    Attributes
    ----------
    found : str
        What the study showed.
    then : str
        What is done next.
    todo : str
        ``settled`` or ``spent`` (the last turn), or what is refined: ``everywhere``, ``cells``, ``steps``.
    mesh : Mesh or None
        The first mesh of the next study, when cells are split.
    owing : (n_steps,) bool or None
        The steps to halve.
    """

    found: str
    then: str
    todo: str
    mesh: Mesh | None = None
    owing: np.ndarray | None = None


class Turner:
    """Decides turn after turn within an allowance.

    Parameters
    ----------
    allowance : Allowance
        Largest finest mesh, cells, and time, s.
    began : float
        `time.perf_counter()` at the start of the vouch.
    """

    def __init__(self, allowance: Allowance, began: float) -> None:
        self.allowance, self.began = allowance, began
        self._last: tuple[str, float] | None = None

    def fits(self, cells: int, seconds: float) -> bool:
        """Return whether a run of so many cells and seconds still fits the allowance."""
        spent = time.perf_counter() - self.began
        return cells <= self.allowance.cells and spent + seconds <= self.allowance.seconds

    def next(self, study: Study, judgement: Judgement, bench: Bench, found: str) -> Turn:
        """Return the next turn."""
        if judgement.settled:
            return Turn(found, "nothing: every wanted band is reached and every limit is settled", "settled")
        worst = judgement.needs[0] if judgement.needs else None
        if worst is None or worst.total <= 1.0:
            return self._prove(study, bench, found) if judgement.restless else Turn(found, BEYOND_REACH, "spent")
        stalled = self._last is not None and self._last[0] != "everywhere" and worst.total > 0.7 * self._last[1]
        for offer in self._offers(study, judgement, bench, worst, stalled=stalled):
            if offer is not None:
                self._last = (offer.todo, worst.total)
                return Turn(found, offer.then, offer.todo, offer.mesh, offer.owing)
        return Turn(found, "stop: nothing that would help fits the rest of the allowance", "spent")

    def _prove(self, study: Study, bench: Bench, found: str) -> Turn:
        """Return the turn that looks whether differences between meshes shrink on a finer one, where all else is settled."""
        offer = self._everywhere(study, bench, "differences between meshes do not yet shrink as they must")
        if offer is None:
            return Turn(
                found, "stop: a finer mesh, which would show whether errors fall, does not fit the allowance", "spent"
            )
        return Turn(found, offer.then, "everywhere")

    def _offers(
        self, study: Study, judgement: Judgement, bench: Bench, worst: Need, *, stalled: bool
    ) -> Iterator[Turn | None]:
        """Yield what might be done, best first; a later offer is worked out only when the earlier ones do not fit."""
        if len(study.levels) < 3:
            return
        if study.timing and worst.time > TIME_SHARE * worst.total:
            yield self._steps(study, bench, worst)
            yield self._everywhere(study, bench, worst.goal.why)
            return
        doubt = self._doubt(study, judgement)
        passes = passes_needed(doubt, 1.0)
        growth = float(np.mean(4.0**passes))
        rounds = max(1, int(np.ceil(np.log2(max(worst.space, 1.001)) / 2.0)))
        dearer = WHOLE_STUDY * growth > sum(4**k for k in range(1, rounds + 1))
        if stalled or dearer or not passes.any():
            yield self._everywhere(study, bench, worst.goal.why)
        yield self._cells(study, bench, doubt)
        yield self._everywhere(study, bench, worst.goal.why)

    def _everywhere(self, study: Study, bench: Bench, why: str) -> Turn | None:
        cells = 4 * len(study.finest.mesh.cells)
        seconds = bench.pace * bench.work(cells, len(study.finest.steps))
        if not self.fits(cells, seconds):
            return None
        return Turn("", f"split every cell ({cells} on the finest mesh), since {why}", "everywhere")

    def _cells(self, study: Study, bench: Bench, doubt: np.ndarray) -> Turn | None:
        mesh = study.levels[0].mesh
        # Where the allowance is too small for the target, the cells that owe most are split as far as it goes.
        for ease in (1.0, 2.0, 4.0, 8.0, 16.0):
            passes = passes_needed(doubt, ease)
            if not passes.any():
                return None
            finer = split_cells(mesh, passes)
            cells = 16 * len(finer.cells)
            seconds = WHOLE_STUDY * bench.pace * bench.work(cells, len(study.finest.steps))
            if self.fits(cells, seconds):
                part = 100 * np.count_nonzero(passes) / len(passes)
                then = f"split the {np.count_nonzero(passes)} cells ({part:.0f} %) that owe most ({cells} on the finest mesh)"
                return Turn("", then, "cells", mesh=finer)
        return None

    @staticmethod
    def _doubt(study: Study, judgement: Judgement) -> np.ndarray:
        """Return each first-mesh cell's doubt over the target of the tightest goal that needs it, (M,)."""
        doubt = cell_doubt(study)
        frames, grid = study.finest.frame_times, judgement.figures.grid
        over = np.zeros(doubt.shape[1])
        for need in judgement.needs:
            if need.total <= 1.0:
                break
            when = np.flatnonzero(need.when)
            early = float(np.min(grid.origin[when] + 0.25 * (grid.t[when] - grid.origin[when])))
            inside = (frames[: len(doubt)] >= early) & (frames[: len(doubt)] <= float(grid.t[when].max()))
            if not inside.any():
                inside[min(int(np.searchsorted(frames, grid.t[when].max())), len(inside) - 1)] = True
            kelvin = (
                AIM * need.goal.wanted
                if need.goal.key.kind in ("gauge", "highest", "lowest", "mean", "difference")
                else None
            )
            worst = doubt[inside].max(axis=0)
            # A goal that is not a temperature has no scale in kelvin: aim at the doubt's own worst, less what it must fall by.
            over = np.maximum(
                over, worst / (kelvin if kelvin is not None else 0.5 * AIM * worst.max() / max(need.space, 1.0))
            )
        return over

    def _steps(self, study: Study, bench: Bench, worst: Need) -> Turn | None:
        owing = self._owing(study, worst)
        steps = len(study.levels[0].steps) + int(owing.sum())
        cells = 16 * len(study.levels[0].mesh.cells)
        seconds = WHOLE_STUDY * bench.pace * bench.work(cells, steps)
        if not self.fits(cells, seconds):
            return None
        return Turn("", f"halve the {int(owing.sum())} steps that owe most ({steps} steps)", "steps", owing=owing)

    @staticmethod
    def _owing(study: Study, worst: Need) -> np.ndarray:
        """Return which steps to halve: those whose doubt is above what the band leaves to time, and the two before each."""
        times = study.timing[0].steps.times
        if worst.goal.key not in study.timing[0].history.keys:  # a derived series: a difference or a rate
            return np.ones(len(times) - 1, dtype=bool)
        owed = step_doubt(study, worst.goal.key)
        owing = owed > 0.25 * owed.max() * TIME_SHARE / worst.time
        for _ in range(2):  # what is wrong at the end of a step was partly made in the steps before it
            owing[:-1] |= owing[1:]
        return owing if owing.mean() < 0.5 else np.ones(len(owing), dtype=bool)


def take(turn: Turn, study: Study, bench: Bench) -> Study:
    """Return the study after a turn."""
    if turn.todo == "cells":
        assert turn.mesh is not None  # noqa: S101 - a local turn carries its mesh
        return bench.finer_cells(study, turn.mesh)
    if turn.todo == "steps":
        assert turn.owing is not None  # noqa: S101 - a step turn carries its steps
        return bench.finer_steps(study, turn.owing)
    return bench.finer_everywhere(study)
