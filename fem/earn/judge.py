"""Hold a study against what was asked: bands against the wanted ones, limits against bands, checks against the data."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fem.checks import check_all
from fem.checks.facts import Facts, Goal, Namer, RegionStock
from fem.docket import Docket
from fem.earn.limits import closing_goal, derived, judge_limit
from fem.results.bands import NARROWEST
from fem.results.figures import Figures
from fem.results.findings import Finding
from fem.results.history import Key
from fem.results.verdicts import Call, Verdict
from fem.runs.study import Study
from fem.runs.tables import figures
from fem.solve.problem import Problem
from fem.solve.run import Gauges

WANTED = "the wanted band asks for it"
"""Why a goal is there that the docket states."""


@dataclass(frozen=True)
class Need:
    """How far one goal is from its wanted band.

    Attributes
    ----------
    goal : Goal
    space, time, total : float
        Largest band over wanted band; 1 or less is enough.
    when : (n,) bool
        Instants of the grid at which the band is too wide.
    t : float
        Where it is widest, s.
    """

    goal: Goal
    space: float
    time: float
    total: float
    when: NDArray[np.bool_]
    t: float


@dataclass(frozen=True)
class Judgement:
    """A study, judged.

    Attributes
    ----------
    figures : Figures
    verdicts : tuple of Verdict
    findings : tuple of Finding
    needs : tuple of Need
        One per goal, the farthest from its wanted band first.
    """

    figures: Figures
    verdicts: tuple[Verdict, ...]
    findings: tuple[Finding, ...]
    needs: tuple[Need, ...]

    @property
    def settled(self) -> bool:
        """True when every wanted band is reached, every limit settled, and errors fall as theory says."""
        return all(need.total <= 1.0 for need in self.needs) and not self.restless and not self.too_close

    @property
    def too_close(self) -> tuple[str, ...]:
        """Return the limits that are too close to call."""
        return tuple(verdict.limit for verdict in self.verdicts if verdict.call is Call.too_close)

    @property
    def restless(self) -> bool:
        """True when differences between meshes do not shrink: a finer mesh must show whether they ever do."""
        return any(finding.check == "order" and finding.blocks for finding in self.findings)


def wanted_goals(docket: Docket, figures: Figures) -> list[Goal]:
    """Return the bands that the docket asks for."""
    wanted, goals = docket.wanted, []
    own = {gauge.name: gauge.band for gauge in docket.gauges}
    through = {exposure.name: exposure.band for exposure in docket.exposures}
    for key in figures.keys:
        band: float | None = None
        if key.kind == "gauge":
            band = own.get(key.name) or wanted.gauges
        elif key.kind in ("highest", "lowest"):
            band = wanted.regions
        elif key.kind == "mean":
            band = wanted.means
        elif key.kind == "flow":
            band = through.get(key.name) or wanted.heat
        elif key.kind == "stored":
            band = wanted.stored
        if band is not None:
            goals.append(Goal(key, float(band), WANTED))
    return goals


def judge(
    docket: Docket, study: Study, problem: Problem, gauges: Gauges, stocks: tuple[RegionStock, ...], names: Namer
) -> Judgement:
    """Return figures, verdicts, findings and needs of a study."""
    table = figures(study, problem, derived(docket))
    goals = wanted_goals(docket, table)
    table = no_narrower(table, goals)
    # What broke off says nothing of the rest of the clock: no band, so no limit is called.
    seen = table if study.finished else replace(table, space=np.full_like(table.space, np.inf))
    verdicts = tuple(judge_limit(docket, limit, seen) for limit in docket.limits)
    floor = NARROWEST * float(docket.wanted.gauges)
    asked = [closing_goal(docket, limit, v, floor) for limit, v in zip(docket.limits, verdicts, strict=True)]
    goals += [goal for goal in asked if goal is not None]
    facts = Facts(study, problem, table, gauges, tuple(goals), stocks, names)
    needs = sorted((need_of(goal, table) for goal in goals), key=lambda need: -need.total)
    return Judgement(table, verdicts, check_all(facts), tuple(needs))


def no_narrower(table: Figures, goals: list[Goal]) -> Figures:
    """Return the figures with no band narrower than `NARROWEST` times the wanted one; the difference goes to the space part."""
    space = table.space.copy()
    for goal in goals:
        i = table.row(goal.key)
        space[i] = np.maximum(space[i], NARROWEST * goal.wanted - table.time[i])
    return replace(table, space=space)


def need_of(goal: Goal, table: Figures) -> Need:
    """Return how far a goal is from its wanted band."""
    i, counts = table.row(goal.key), goal.counts(table)
    if not counts.any():
        counts = np.arange(len(table.grid.t)) == int(np.argmin(np.abs(table.grid.t - goal.end)))
    total = (table.space[i] + table.time[i]) / goal.wanted
    worst = int(np.argmax(np.where(counts, total, -np.inf)))
    return Need(
        goal,
        float(np.max(table.space[i][counts])) / goal.wanted,
        float(np.max(table.time[i][counts])) / goal.wanted,
        float(total[worst]),
        counts & (total > 1.0),
        float(table.grid.t[worst]),
    )


def too_wide(key: Key) -> str:
    """Return a series as words for a sentence."""
    words = {
        "gauge": "gauge",
        "flow": "heat flow through",
        "heat": "heat through",
        "stored": "stored heat",
        "mean": "mean of",
    }
    return (
        f'{words.get(key.kind, key.kind)} "{key.name}"'
        if key.name
        else f"{words.get(key.kind, key.kind)} of the section"
    )
