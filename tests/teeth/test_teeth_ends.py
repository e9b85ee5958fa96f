"""However a run ends, a record is left that says so, can be kept and can be read."""

import numpy as np
import pytest

from fem.docket import Allowance, Limit
from fem.laws import Break, Law
from fem.results.history import Key
from fem.results.store import load, save
from fem.solve.conduction import Conduction
from fem.solve.march import March, Outcome
from fem.solve.run import run
from fem.vouch import look, vouch
from tests.support.cases import BRICK, gauges_at, slab_docket
from tests.support.grids import face, problem_on, strip

LIMITS = (
    Limit(name="late", at="back", must="stay below", temperature=900.0, during=(500.0, 600.0)),
    Limit(name="reach", at="back", must="reach", temperature=900.0, within=550.0),
    Limit(name="hold", at="back", must="hold above", temperature=300.0, at_least=100.0),
    Limit(name="slow", at="back", must="heat slower than", rate=1.0, over=300.0),
    Limit(name="even", at="back", must="differ less than", other="near", below=500.0),
    Limit(name="whole", at="anywhere", must="stay above", temperature=280.0),
)
GAUGES = {"back": (0.0, 0.005), "near": (0.035, 0.005)}


class AfterCalls:
    """Says stop from the n-th question on."""

    def __init__(self, n):
        self.left = n

    def __call__(self):
        self.left -= 1
        return self.left < 0


def assert_kept(record, folder):
    """Fail unless the record survives the disk and claims nothing that it has not earned."""
    again = load(save(record, folder))
    assert again.outcome == record.outcome
    assert again.standing == record.standing == "open"
    assert record.reasons
    assert np.isfinite(record.figures.value).any()
    assert all(np.isfinite(v.band) or v.call.value == "too close to call" for v in record.verdicts)


@pytest.mark.parametrize("limits", [(), LIMITS], ids=["no limits", "limits"])
def test_interruption_at_every_stage_leaves_a_valid_record(tmp_path, limits):
    total = AfterCalls(10**9)
    docket = slab_docket(gauges=GAUGES, limits=limits, wanted={"gauges": 0.3})
    whole = vouch(docket, stop=total)
    asked = 10**9 - total.left
    assert whole.outcome == "finished"
    stages = set()
    for n in np.unique(np.linspace(0, asked - 1, 16).astype(int)):
        seen = []
        record = vouch(docket, stop=AfterCalls(int(n)), on_progress=lambda p, seen=seen: seen.append(p.doing))
        assert record.outcome == "interrupted", n
        assert_kept(record, tmp_path / str(n))
        stages.add(seen[-1])
    assert stages == {"first mesh", "steps halved", "steps quartered", "cells halved", "cells quartered"}


def test_interruption_in_a_later_turn_keeps_the_whole_study_before_it(tmp_path):
    docket = slab_docket(wanted={"gauges": 0.02}, gauges=GAUGES)
    turns = []
    record = vouch(docket, on_turn=turns.append, stop=lambda: len(turns) > 0)
    assert record.outcome == "interrupted"
    assert len(record.facts["cells"]) == 3
    assert np.isfinite(record.figures.band).all()
    assert_kept(record, tmp_path / "later")


def test_interruption_of_a_quick_look_and_of_a_steady_job(tmp_path):
    for n, record in enumerate(
        (look(slab_docket(), stop=lambda: True), vouch(slab_docket(end=None), stop=lambda: True))
    ):
        assert record.outcome == "interrupted"
        assert_kept(record, tmp_path / str(n))


def test_a_quick_look_claims_nothing(tmp_path):
    record = look(slab_docket(gauges=GAUGES, limits=LIMITS))
    assert record.outcome == "finished"
    assert np.isinf(record.figures.band).all()
    assert all(v.call.value == "too close to call" for v in record.verdicts)
    assert_kept(record, tmp_path / "look")


@pytest.mark.parametrize("seconds", [1e-6, 0.05])
def test_a_deadline_in_the_first_study_leaves_a_record(tmp_path, seconds):
    record = vouch(
        slab_docket(
            gauges=GAUGES, limits=LIMITS, end=86400.0, wanted={"gauges": 0.001}, allowance=Allowance(seconds=seconds)
        )
    )
    assert_kept(record, tmp_path / "late")
    assert "allowance" in record.outcome or record.turns[-1].then.startswith("stop")


def melting(T):
    """Return a conductivity that nobody stated above 350 K."""
    return np.where(T < 350.0, 1.0, np.nan)


def test_newton_that_fails_is_an_outcome_and_keeps_what_came_before():
    """Only the steps that the fault reaches are lost."""
    mesh = strip(cells=4)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(5.0, 500.0))], k=melting, start=300.0, end=5.0
    )
    result = run(mesh, problem, gauges_at((0.0, 0.0)), tolerance=0.1, first=0.01)
    assert result.outcome is Outcome.newton_failed
    assert len(result.steps) > 3
    assert 0.0 < result.history.t1[-1] < 5.0
    assert 310.0 < result.peak.max() < 400.0
    assert np.isfinite(result.history.v1).all()


def test_a_docket_whose_law_breaks_the_equations_gets_an_open_record():
    stock = {"stuff": {**BRICK, "conductivity": melting}}
    for work in (vouch, look):
        record = work(slab_docket(stock=stock, gauges=GAUGES))
        assert record.outcome == Outcome.newton_failed.value
        assert record.standing == "open"
        assert any(f.check == "outcome" and f.blocks for f in record.findings)
        assert record.figures.grid.t[-1] < 600.0


def test_a_replay_that_fails_is_an_outcome_too():
    mesh = strip(cells=4)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(5.0, 500.0))], k=melting, start=300.0, end=5.0
    )
    chosen = run(
        mesh, problem_on(mesh.plan, problem.faces, start=300.0, end=5.0), gauges_at(), tolerance=0.1, first=0.01
    )
    result = run(mesh, problem, gauges_at(), tolerance=0.1, steps=chosen.steps)
    assert result.outcome is Outcome.newton_failed


def test_a_linear_problem_that_meets_an_undefined_value_says_so():
    bad = Law(lambda t: np.where(t < 0.5, 400.0, np.nan), frozenset({"t"}), (Break(0.5, jump=True),))
    mesh = strip(cells=4)
    problem = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(5.0, bad))], start=300.0, end=1.0)
    result = run(mesh, problem, gauges_at(), tolerance=0.1, first=0.01)
    assert result.outcome is not Outcome.finished
    assert result.history.t1[-1] <= 0.5
    assert np.isfinite(result.history.v1).all()


def test_a_steady_job_that_has_no_solution_says_so():
    """A source that grows faster with temperature than any film can carry off: T'' = -exp(T - 300) runs away (Frank-Kamenetskii)."""
    with np.errstate(over="ignore", invalid="ignore"):
        docket = slab_docket(end=None, exposures={"cold": {"on": ("slab.right",), "held": 300.0}})
        hot = docket.section.regions[0].model_copy(
            update={"source": lambda T: 4000.0 * np.exp(np.minimum(T - 300.0, 500.0))}
        )
        docket = docket.model_copy(update={"section": docket.section.model_copy(update={"regions": (hot,)})})
        record = vouch(docket)
    assert record.outcome != "finished"
    assert record.standing == "open"


def test_a_march_without_a_clock_is_refused():
    mesh = strip(cells=2)
    with pytest.raises(ValueError, match="needs a clock"):
        March(Conduction(mesh, problem_on(mesh.plan, begin=None, end=None)), tolerance=1.0)


def test_the_interrupted_gauge_history_is_that_of_the_whole_up_to_there():
    docket = slab_docket(gauges=GAUGES)
    whole, part = look(docket), look(docket, stop=AfterCalls(8))
    key, t = Key("gauge", "near"), part.figures.grid.t
    assert 1 < len(t) < len(whole.figures.grid.t)
    np.testing.assert_array_equal(part.figures.series(key)[0], whole.figures.series(key)[0][: len(t)])


@pytest.mark.parametrize(("rows", "told"), [(500, True), (50, False)])
def test_a_crowded_log_is_named_when_the_allowance_ran_out(rows, told):
    points = [[600.0 * i / rows, 300.0 + i % 2] for i in range(rows + 1)]
    hot = {"hot": {"on": ("slab.right",), "film": {"coefficient": 50.0, "ambient": {"points": points}}}}
    record = vouch(slab_docket(exposures=hot, allowance={"seconds": 1e-3}))
    assert record.outcome != "finished"
    assert any("thin the logs" in reason.close for reason in record.reasons) is told
