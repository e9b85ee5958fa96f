"""What a vouch does next: each kind of debt leads to its own turn, and an allowance that ends leaves an honest record."""

import time
from dataclasses import replace

import numpy as np
import pytest

from fem.docket import Allowance, Limit, Wanted
from fem.earn.judge import judge
from fem.earn.pose import pose
from fem.earn.turns import Turner, take
from fem.mesh.make import make_mesh
from fem.results.findings import Finding
from fem.results.history import Key
from fem.results.verdicts import Call
from fem.runs.study import Bench, TooDear
from fem.solve.march import Outcome
from fem.solve.run import run
from fem.solve.stepping import Steps
from fem.vouch import FIRST_MESHES, vouch
from tests.support.cases import box, docket_of, region, slab_docket
from tests.support.series import slab_film

FILM = {"kiln": {"on": ("slab.right",), "film": {"coefficient": 60.0, "ambient": 1073.15}}}


class Desk:
    """One study on the way through a vouch, with everything at hand."""

    def __init__(self, docket, *, tolerance=None, allowance=None):
        self.posed = pose(docket)
        self.tolerance = 0.2 * self.posed.narrowest if tolerance is None else tolerance
        self.bench = Bench(self.posed.problem, self.posed.gauges, tolerance=self.tolerance)
        self.study = self.bench.first(make_mesh(self.posed.plan, gauges=self.posed.gauges.points))
        self.turner = Turner(docket.allowance if allowance is None else allowance, time.perf_counter())

    def judged(self, study=None):
        p = self.posed
        return judge(p.docket, study or self.study, p.problem, p.gauges, p.stocks, p.names)

    def turn(self, judgement=None):
        return self.turner.next(self.study, judgement or self.judged(), self.bench, "")


def wavy():
    """Return a docket whose ambient swings, so that large steps miss it."""
    ambient = {"daily_wave": {"mean": 600.0, "swing": 200.0, "peak_at": 15 * 3600.0}}
    faces = {"kiln": {"on": ("slab.right",), "film": {"coefficient": 60.0, "ambient": ambient}}}
    return slab_docket(thick=0.02, end=86400.0, exposures=faces, wanted=Wanted(gauges=0.5))


def test_steps_that_owe_are_halved_and_the_band_falls():
    desk = Desk(wavy(), tolerance=1e3)
    before = desk.judged()
    worst = before.needs[0]
    assert worst.time > 0.5 * worst.total > 0.5  # the planted fault: steps far too large
    turn = desk.turn(before)
    assert turn.todo == "steps"
    assert 0 < turn.owing.sum() <= len(desk.study.levels[0].steps)
    after = take(turn, desk.study, desk.bench)
    assert len(after.levels[0].steps) == len(desk.study.levels[0].steps) + turn.owing.sum()
    assert after.levels[0].mesh is desk.study.levels[0].mesh
    assert desk.judged(after).needs[0].time < worst.time


def local_docket(wanted=0.05):
    """Return a wide block of which one corner alone is watched, near the only warm stretch of edge."""
    faces = {"jet": {"on": ({"region": "block", "start": (0.0, 0.0), "end": (0.01, 0.0)},), "held": 600.0}}
    return docket_of(
        [region("block", box(0, 0, 0.2, 0.1))],
        faces,
        end=200.0,
        gauges={"by the jet": (0.014, 0.003)},
        wanted=Wanted(gauges=wanted),
    )


def test_cells_that_owe_are_split_where_they_lie():
    desk = Desk(local_docket(wanted=1.0))
    judgement = desk.judged()
    worst = judgement.needs[0]
    assert worst.total > 1.0
    assert worst.space > worst.time
    turn = desk.turn(judgement)
    assert turn.todo == "cells"
    old, new = desk.study.levels[0].mesh, turn.mesh
    near = [np.hypot(*(m.points[m.cells].mean(axis=1) - (0.01, 0.0)).T) < 0.02 for m in (old, new)]
    far = [np.hypot(*(m.points[m.cells].mean(axis=1) - (0.01, 0.0)).T) > 0.1 for m in (old, new)]
    assert near[1].sum() >= 4 * near[0].sum()
    assert far[1].sum() <= 1.1 * far[0].sum()
    after = take(turn, desk.study, desk.bench)
    assert desk.judged(after).needs[0].total < worst.total


def test_where_all_cells_owe_all_are_split_and_two_runs_are_used_again():
    desk = Desk(slab_docket(exposures=FILM, wanted=Wanted(gauges=0.02)), tolerance=1e-4)
    turn = desk.turn()
    assert turn.todo == "everywhere"
    after = take(turn, desk.study, desk.bench)
    assert after.levels[:2] == desk.study.levels[1:]
    assert len(after.finest.mesh.cells) == 4 * len(desk.study.finest.mesh.cells)


def test_nothing_is_done_where_nothing_is_owed():
    desk = Desk(slab_docket(wanted=Wanted(gauges=20.0)))
    assert desk.judged().settled
    assert desk.turn().todo == "settled"


def test_differences_that_do_not_shrink_ask_for_a_finer_mesh_though_all_bands_are_narrow():
    desk = Desk(slab_docket(wanted=Wanted(gauges=20.0)))
    restless = replace(desk.judged(), findings=(Finding(check="order", message="planted", blocks=True),))
    assert not restless.settled
    assert desk.turn(restless).todo == "everywhere"
    desk.turner.allowance = Allowance(cells=100)
    assert desk.turn(restless).todo == "spent"


@pytest.mark.parametrize("allowance", [Allowance(cells=100), Allowance(seconds=1e-9)])
@pytest.mark.parametrize("make", [wavy, local_docket])
def test_an_allowance_that_is_too_small_ends_the_work(make, allowance):
    desk = Desk(make(), tolerance=1e3 if make is wavy else None, allowance=allowance)
    assert desk.turn().todo == "spent"


def test_an_offer_must_fit_cells_and_seconds():
    turner = Turner(Allowance(cells=1000, seconds=100.0), time.perf_counter())
    assert turner.fits(1000, 90.0)
    assert not turner.fits(1001, 1.0)
    assert not turner.fits(10, 101.0)


def test_a_spent_vouch_keeps_what_it_computed_and_stays_open():
    docket = local_docket(wanted=0.001).model_copy(update={"allowance": Allowance(cells=20000, seconds=100.0)})
    told = []
    record = vouch(docket, on_turn=told.append)
    assert record.outcome == "finished"
    assert record.standing == "open"
    assert record.turns == tuple(told)
    assert record.turns[-1].then.startswith("stop")
    assert any("times the wanted one" in reason.text for reason in record.reasons)
    assert len(record.mesh.cells) <= 20000
    value, band = record.figures.series(Key("gauge", "by the jet"))
    assert np.isfinite(value).all()
    assert np.isfinite(band).all()


def limited(threshold, **more):
    limit = Limit(name="cool", at="back", must="stay below", temperature=threshold)
    return slab_docket(exposures=FILM, limits=(limit,), **more)


def test_a_limit_that_is_too_close_to_call_is_chased_until_it_is_settled():
    exact = slab_film(0.0, 600.0, half=0.04, k=1.0, alpha=1 / 1.8e6, h=60.0, start=293.15, ambient=1073.15)
    record = vouch(limited(exact + 0.3, wanted=Wanted(gauges=10.0)))
    assert record.verdicts[0].call is Call.met
    assert record.verdicts[0].margin == pytest.approx(0.3, abs=record.verdicts[0].band)
    assert record.standing == "vouched"
    other = vouch(limited(exact - 0.3, wanted=Wanted(gauges=10.0)))
    assert other.verdicts[0].call is Call.not_met
    assert other.standing == "vouched"  # the answer is no, and it is sure


def test_a_study_that_broke_off_settles_no_limit():
    """The planted fault: the finest run ends half way, when the limit still holds; at the end it does not."""
    desk = Desk(limited(340.0))
    assert desk.judged().verdicts[0].call is Call.not_met
    finest = desk.study.finest
    half = Steps(finest.steps.times[: len(finest.steps) // 2], finest.steps.breaks)
    cut = run(
        finest.mesh,
        desk.posed.problem,
        desk.posed.gauges,
        tolerance=desk.tolerance,
        steps=half,
        frame_times=finest.frame_times,
    )
    broken = replace(desk.study, levels=(*desk.study.levels[:-1], replace(cut, outcome=Outcome.newton_failed)))
    judgement = desk.judged(broken)
    assert judgement.figures.grid.t[-1] < 600.0
    assert judgement.verdicts[0].margin > 0.0
    assert judgement.verdicts[0].call is Call.too_close


def test_a_limit_on_the_very_value_stays_open_within_the_allowance():
    exact = slab_film(0.0, 600.0, half=0.04, k=1.0, alpha=1 / 1.8e6, h=60.0, start=293.15, ambient=1073.15)
    record = vouch(limited(exact, wanted=Wanted(gauges=30.0), allowance=Allowance(cells=5000, seconds=100.0)))
    assert record.verdicts[0].call is Call.too_close
    assert record.standing == "open"
    assert any("too close to call" in reason.text for reason in record.reasons)


def test_no_band_is_narrower_than_a_fiftieth_of_the_wanted_one_and_such_a_band_shows_no_order():
    """A limit that lies nearer than that stays open, but nobody chases the noise of differences far below it."""
    exact = slab_film(0.0, 600.0, half=0.04, k=1.0, alpha=1 / 1.8e6, h=60.0, start=293.15, ambient=1073.15)
    record = vouch(limited(exact + 0.3, wanted=Wanted(gauges=30.0)))
    _, band = record.figures.series(Key("gauge", "back"))
    assert band.min() >= 0.02 * 30.0 * (1 - 1e-12)
    assert record.verdicts[0].call is Call.too_close
    assert not any(f.check == "order" for f in record.findings)
    assert len(record.turns) == 1


# --- a first study that does not fit the allowance ------------------------------------------------------------------------------------


def first_mesh_cells():
    docket = slab_docket()
    posed = pose(docket)
    return [len(make_mesh(posed.plan, gauges=posed.gauges.points, finer=finer).cells) for finer in FIRST_MESHES]


def test_an_allowance_for_a_coarser_first_mesh_gets_one():
    usual, coarse = first_mesh_cells()
    assert coarse < usual
    record = vouch(slab_docket(allowance={"cells": 16 * usual - 1, "seconds": 60.0}))
    assert record.facts["cells"][-1] <= 16 * usual - 1
    assert record.facts["cells"][0] <= coarse or len(record.turns) > 2
    assert "half as many cells across" in record.turns[0].then
    assert np.isfinite(record.figures.band).any()


def test_an_allowance_for_no_three_meshes_gives_one_run_and_says_so():
    coarse = first_mesh_cells()[-1]
    assert 16 * coarse > 100, "the least allowance that a docket may state"
    record = vouch(slab_docket(allowance={"cells": 100, "seconds": 60.0}))
    assert record.standing == "open"
    assert f"three meshes would need {16 * coarse} cells" in record.outcome
    assert np.isinf(record.figures.band).all()
    assert record.turns[-2].then.startswith("one run alone")


def test_a_study_that_would_take_too_long_is_not_begun():
    posed = pose(slab_docket())
    bench = Bench(posed.problem, posed.gauges, tolerance=0.1)
    mesh = make_mesh(posed.plan, gauges=posed.gauges.points)
    with pytest.raises(TooDear, match="about"):
        bench.first(mesh, most_seconds=1e-9)
    assert len(bench.first(mesh, most_seconds=1e9).levels) == 3
