"""The rule of the band, on series whose errors are known by construction."""

import numpy as np
import pytest

from fem.laws import Break, Law
from fem.results.bands import (
    ORDER_HIGH,
    ORDER_LOW,
    SAFETY,
    along_steps,
    between_ends,
    three_levels,
    time_levels,
    window_max,
)
from fem.runs.grids import grid_of, report_times, steady_grid
from fem.solve.stepping import Steps
from tests.support.grids import box_plan, face, problem_on

PLAN = box_plan((0.0, 1.0), 1.0)


def problem(report=0.25, instants=(), breaks=(), begin=0.0, end=1.0):
    law = Law(lambda t: 1.0 + 0.0 * t, frozenset({"t"}), tuple(breaks))
    return problem_on(
        PLAN,
        [face(PLAN, "part 0.right", film=(1.0, law))],
        begin=begin,
        end=end,
        report_every=report,
        instants=instants,
    )


def grid(breaks=(), n=8, **how):
    posed = problem(breaks=breaks, **how)
    return grid_of(posed, Steps(np.linspace(posed.begin, posed.end, n + 1), {b.t: b.jump for b in posed.breaks()}))


def series(order, g, c=1.0, exact=10.0):
    """Return three levels of a series whose error is c h^order, constant in time."""
    return [np.full((1, len(g.t)), exact + c * h**order) for h in (1.0, 0.5, 0.25)]


@pytest.mark.parametrize("order", [0.6, 1.0, 1.3, 2.0, 4.0])
def test_three_levels_finds_the_order_and_covers_the_error(order):
    g = grid()
    part = three_levels(*series(order, g), g)
    assert part.order == pytest.approx(np.full((1, len(g.t)), order))
    error = 0.25**order
    assert (part.band >= error).all()
    w = 0.5**order * (1 - 0.5**order)  # |fine - middle| over c
    w2 = 1 - 0.5**order
    expected = (
        SAFETY * max(w, w2 / 4) / (2 ** min(max(order, ORDER_LOW), ORDER_HIGH) - 1)
    )  # design of the rule, numerics note
    assert part.band == pytest.approx(np.full((1, len(g.t)), expected))


def test_an_order_below_the_floor_is_not_trusted():
    g = grid()
    part = three_levels(*series(0.1, g), g)
    w2 = 1 - 0.5**0.1
    assert part.band[0, 0] == pytest.approx(SAFETY * 0.5**0.1 * w2 / (2**ORDER_LOW - 1))
    assert part.order[0, 0] == pytest.approx(0.1)


def test_a_difference_that_passes_through_zero_is_still_covered():
    """Errors that swing: the plain pointwise rule claims nothing where two levels happen to cross."""
    g = grid(n=64)
    wave = np.cos(20 * np.log(g.t + 0.05))[None]
    levels = [10.0 + h**2 * wave for h in (1.0, 0.5, 0.25)]
    part = three_levels(*levels, g)
    late = g.t > 0.1
    assert (part.band[:, late] >= np.abs(levels[2] - 10.0)[:, late]).all()
    pointwise = SAFETY * np.abs(levels[2] - levels[1]) / 3
    assert pointwise[:, late].min() < 0.1 * part.band[:, late].min()


def test_equal_levels_have_no_band_and_an_infinite_order():
    g = grid()
    part = three_levels(*(np.ones((2, len(g.t))) for _ in range(3)), g)
    assert (part.band == 0.0).all()
    assert np.isinf(part.order).all()


def test_a_band_can_not_vanish_because_the_finer_two_agree():
    g = grid()
    coarse, same = np.zeros((1, len(g.t))), np.ones((1, len(g.t)))
    assert three_levels(coarse, same, same, g).band == pytest.approx(
        np.full((1, len(g.t)), SAFETY / 4 / (2**ORDER_HIGH - 1))
    )


def test_the_window_reaches_from_half_to_twice_the_time_since_the_jump():
    g = grid(n=64, report=1.0)
    spike = np.zeros((1, len(g.t)))
    at = int(np.argmin(np.abs(g.t - 0.4)))
    spike[0, at] = 1.0
    seen = g.t[window_max(spike, g)[0] > 0]
    step = 1 / 64  # the window never cuts a step in two
    assert g.t[at] / 2 - step <= seen.min() <= g.t[at] / 2 + step
    assert 2 * g.t[at] - step <= seen.max() <= 2 * g.t[at] + step


def test_the_window_never_crosses_a_jump():
    g = grid((Break(0.5, jump=True),), n=16)
    values = np.where((g.t < 0.5) | ((g.t == 0.5) & (g.side < 0)), 1.0, 2.0)[None]
    assert (window_max(values, g) == values).all()
    assert set(g.origin[(g.t == 0.5)]) == {0.0, 0.5}


def test_a_kink_is_no_jump():
    g = grid((Break(0.5, jump=False),), n=16)
    assert (g.origin == 0.0).all()
    assert (g.t == 0.5).sum() == 1


def test_the_grid_holds_reports_both_sides_of_jumps_and_points_inside_steps():
    g = grid((Break(0.375, jump=True),), n=8, report=0.25, instants=(0.33,))
    assert sorted(set(g.t[g.reported])) == pytest.approx([0.25, 0.33, 0.5, 0.75, 1.0])
    assert list(g.side[g.t == 0.375]) == [-1, 1]
    assert g.side[0] == 1
    assert (np.diff(g.t) >= 0).all()
    inside = ~g.ends
    assert (g.t[g.first[inside]] < g.t[inside]).all()
    assert (g.t[g.last[inside]] > g.t[inside]).all()
    assert inside.sum() >= 3 * 8


def test_a_grid_can_be_cut_at_a_step_end():
    g = grid(n=10, report=0.25)
    cut = g.upto(0.57)
    assert cut.t[-1] == pytest.approx(0.5)
    assert cut.last.max() <= len(cut.t) - 1


def test_report_times_end_with_the_clock():
    assert report_times(problem(report=0.3)) == pytest.approx([0.3, 0.6, 0.9, 1.0])
    assert report_times(problem(report=0.1))[-1] == 1.0
    assert len(report_times(problem(report=0.1))) == 10
    assert report_times(problem(report=0.5, begin=-1.0, end=1.0)) == pytest.approx([-0.5, 0.0, 0.5, 1.0])
    assert report_times(problem(report=0.0, instants=(0.2, 3.0))) == pytest.approx([0.2, 1.0])


def test_a_steady_state_has_one_instant():
    g = steady_grid()
    assert len(g.t) == 1
    levels = [np.array([[10.0 + h**2]]) for h in (1.0, 0.5, 0.25)]
    assert three_levels(*levels, g).band[0, 0] >= 0.25**2


def test_time_levels_cover_the_largest_steps_and_the_shape_between_ends():
    g = grid(n=8)
    hump = np.where(g.ends, 0.0, 1.0)[None]
    whole = np.zeros((1, len(g.t)))
    half, quarter = whole + 0.8 + 0.5 * hump, whole + 0.9 + hump
    part, shape = time_levels(whole, half, quarter, g)
    assert shape == pytest.approx(hump)
    assert (part.band >= 0.9 + 0.5 * hump).all()
    ends = np.where(g.ends, 1.0, 0.0)
    rest = three_levels(whole, half * ends, quarter * ends, g).band
    assert part.band == pytest.approx(along_steps(0.9 + rest, g) + 0.5 * hump)


def test_between_ends_takes_off_the_straight_line():
    g = grid(n=4)
    line = 3.0 + 2.0 * g.t[None]
    assert between_ends(line, g) == pytest.approx(np.zeros((1, len(g.t))))
    bump = np.where(g.ends, 7.0, 8.0)[None]
    assert between_ends(bump, g) == pytest.approx(np.where(g.ends, 0.0, 1.0)[None])
