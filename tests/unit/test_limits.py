"""Verdicts on series made by hand: met, not met and too close to call at each `must`."""

import numpy as np
import pytest

from fem.docket import Limit
from fem.earn.limits import (
    closing_goal,
    derived,
    first_reach,
    held_level,
    judge_limit,
    plain_subject,
    rate_span,
    subject,
)
from fem.results.bands import Grid
from fem.results.figures import Figures
from fem.results.history import Key
from fem.results.verdicts import Call
from tests.support.cases import box, docket_of, region, slab_docket

T = np.linspace(0.0, 100.0, 101)
RAMP = 300.0 + T  # 300 K to 400 K at 1 K/s
PEAK = 400.0 - np.abs(T - 50.0)


def docket(*limits):
    return slab_docket(
        gauges={"back": (0.0, 0.005), "near": (0.02, 0.005)}, end=400.0, report=10.0, limits=limits
    )  # the clock runs on: the work broke off at 100 s


def limit(must, **how):
    return Limit(name="it", at=how.pop("at", "back"), must=must, **how)


def table(values, band, key=None, lim=None):
    """Return figures of one series."""
    key = key or (subject(docket(lim), lim) if lim is not None else Key("gauge", "back"))
    n = len(T)
    grid = Grid(
        T, -np.ones(n, dtype=int), np.zeros(n), np.full(n, 100.0), np.ones(n, dtype=bool), np.arange(n), np.arange(n)
    )
    b = np.broadcast_to(np.asarray(band, dtype=float), (1, n)).copy()
    return Figures((key,), grid, values[None], b, np.zeros((1, n)), np.full((1, n), 2.0))


def verdict(must, values, band, **how):
    lim = limit(must, **how)
    return judge_limit(docket(lim), lim, table(np.asarray(values, dtype=float), band, lim=lim))


# --- each `must`: a margin of 5 on the good side, of 5 on the bad side, and the critical instant --------------------------------------

CASES = {
    "stay below": (RAMP, {"temperature": 405.0}, {"temperature": 395.0}, 100.0),
    "stay above": (RAMP, {"temperature": 295.0}, {"temperature": 305.0}, 0.0),
    "reach": (PEAK, {"temperature": 395.0}, {"temperature": 405.0}, 50.0),
    "hold above": (PEAK, {"temperature": 385.0, "at_least": 20.0}, {"temperature": 395.0, "at_least": 20.0}, None),
    "heat slower than": (np.where(T < 40, 1.0, 15.0), {"rate": 20.0}, {"rate": 10.0}, 40.0),
    "cool slower than": (-np.where(T < 40, 1.0, 15.0), {"rate": 20.0}, {"rate": 10.0}, 40.0),
    "differ less than": (0.2 * T, {"other": "near", "below": 25.0}, {"other": "near", "below": 15.0}, 100.0),
}


@pytest.mark.parametrize("must", CASES)
def test_met_not_met_and_too_close(must):
    values, good, bad, when = CASES[must]
    met = verdict(must, values, 4.9, **good)
    assert (met.call, met.margin, met.band) == (Call.met, pytest.approx(5.0), pytest.approx(4.9))
    fails = verdict(must, values, 4.9, **bad)
    assert (fails.call, fails.margin) == (Call.not_met, pytest.approx(-5.0))
    for how in (good, bad):
        assert verdict(must, values, 5.1, **how).call is Call.too_close
        assert verdict(must, values, np.inf, **how).call is Call.too_close
        assert verdict(must, values, np.nan, **how).call is Call.too_close
    if when is not None:
        assert met.t == when
    assert met.is_rate == ("rate" in good)
    assert met.bands == pytest.approx(5.0 / 4.9)


def test_a_difference_counts_either_way_round():
    assert verdict("differ less than", -0.2 * T, 1.0, other="near", below=15.0).call is Call.not_met


def test_a_wide_band_far_from_the_worst_instant_counts():
    """The value is far below the threshold at 20 s, but so unsure there that it may lie above."""
    band = np.where(T == 20.0, 200.0, 1.0)
    seen = verdict("stay below", RAMP, band, temperature=420.0)
    assert seen.call is Call.too_close
    assert seen.margin == pytest.approx(20.0)
    assert seen.band == pytest.approx(320.0 + 200.0 - 400.0)


def test_a_limit_is_judged_only_while_it_is_in_force():
    assert verdict("stay below", RAMP, 1.0, temperature=350.0).call is Call.not_met
    assert verdict("stay below", RAMP, 1.0, temperature=350.0, during=(0.0, 40.0)).call is Call.met
    assert verdict("hold above", PEAK, 1.0, temperature=385.0, at_least=20.0, during=(60.0, 100.0)).call is Call.not_met


def test_a_limit_that_the_work_did_not_come_to_is_not_called():
    seen = verdict("stay below", RAMP, 1.0, temperature=350.0, during=(150.0, 200.0))
    assert seen.call is Call.too_close
    assert np.isinf(seen.band)


def test_reach_within_a_time_and_when():
    assert verdict("reach", RAMP, 1.0, temperature=350.0, within=60.0).call is Call.met
    late = verdict("reach", RAMP, 1.0, temperature=350.0, within=40.0)
    assert late.call is Call.not_met
    assert late.margin == pytest.approx(-10.0)
    when = verdict("reach", RAMP, 2.0, temperature=350.0)
    assert when.crossing == pytest.approx((50.0, 48.0, 52.0))
    never = verdict("reach", RAMP, 2.0, temperature=399.0)
    assert never.crossing[:2] == pytest.approx((99.0, 97.0))
    assert never.crossing[2] == np.inf


def test_a_span_longer_than_the_record_is_never_held():
    seen = verdict("hold above", np.full(101, 500.0), 1.0, temperature=300.0, at_least=200.0)
    assert seen.call is not Call.met


def test_first_reach_lies_between_instants():
    t, v = np.array([0.0, 10.0, 20.0]), np.array([0.0, 5.0, 0.0])
    assert first_reach(t, v, 2.0) == pytest.approx(4.0)
    assert first_reach(t, v, -1.0) == 0.0
    assert first_reach(t, v, 6.0) == np.inf


def test_held_level_is_the_best_span():
    level, tightest = held_level(T, PEAK, 20.0)
    assert level == pytest.approx(390.0)
    assert tightest in (pytest.approx(40.0), pytest.approx(60.0))
    # The span begins and ends between instants: the same peak on a coarser record, and a span that fits no instant of it.
    assert held_level(T[::5], PEAK[::5], 23.0)[0] == pytest.approx(388.5)
    assert held_level(T, PEAK, 100.0)[0] == pytest.approx(350.0)
    assert held_level(T, PEAK, 101.0)[0] == -np.inf


def test_subjects():
    two = docket_of(
        [region("a", box(0, 0, 1, 1)), region("b", box(1, 0, 2, 1))], {"x": {"on": ("a.left",), "held": 300.0}}, end=1.0,
        gauges={"g": (0.5, 0.5)},
    )  # fmt: skip
    assert plain_subject(two, "g", lowest=True) == Key("gauge", "g")
    assert plain_subject(two, "a", lowest=True) == Key("lowest", "a")
    assert plain_subject(two, "a", lowest=False) == Key("highest", "a")
    assert plain_subject(two, "anywhere", lowest=False) == Key("highest", "")
    assert plain_subject(docket(), "anywhere", lowest=True) == Key("lowest", "slab")
    assert subject(docket(), limit("reach", temperature=1.0, at="slab")).kind == "lowest"
    assert subject(docket(), limit("stay below", temperature=1.0, at="slab")).kind == "highest"


def test_derived_series_are_asked_for_once():
    same = [
        limit("heat slower than", rate=1.0),
        limit("cool slower than", rate=2.0),
        limit("differ less than", other="near", below=1.0),
    ]
    asked = derived(docket(*(one.model_copy(update={"name": str(i)}) for i, one in enumerate(same))))
    assert {d.key.kind for d in asked} == {"rate", "difference"}
    assert len(asked) == 2
    assert rate_span(docket(), same[0]) == 10.0  # the reporting interval
    assert rate_span(docket(), limit("heat slower than", rate=1.0, over=7.0)) == 7.0


def test_only_what_is_too_close_asks_for_a_narrower_band():
    lim = limit("stay below", temperature=405.0)
    for band, asks in ((4.0, False), (6.0, True)):
        goal = closing_goal(docket(lim), lim, judge_limit(docket(lim), lim, table(RAMP, band, lim=lim)), 0.02)
        assert (goal is not None) == asks
    assert goal.wanted == pytest.approx(0.7 * 5.0)
    assert goal.wanted < 5.0  # so that the limit is settled when it is reached
    tight = limit("stay below", temperature=400.0)
    goal = closing_goal(docket(tight), tight, judge_limit(docket(tight), tight, table(RAMP, 6.0, lim=tight)), 0.02)
    assert goal.wanted == 0.02
    far = limit("stay below", temperature=350.0, during=(150.0, 200.0))
    assert closing_goal(docket(far), far, judge_limit(docket(far), far, table(RAMP, 6.0, lim=far)), 0.02) is None
