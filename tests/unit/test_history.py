"""Reading between steps."""

import numpy as np
import pytest

from fem.results.history import History, Key, balanced, hermite


def cubic(t):
    return 1.0 + 2.0 * t - 3.0 * t**2 + 0.5 * t**3


def slope(t):
    return 2.0 - 6.0 * t + 1.5 * t**2


def history(kind="gauge", jump=False):
    t0, t1 = np.array([0.0, 1.0]), np.array([1.0, 3.0])
    v0, v1 = cubic(t0)[None], cubic(t1)[None]
    if jump:
        v0 = v0 + np.array([[0.0, 10.0]])
    return History((Key(kind, "a"),), t0, t1, v0, v1, slope(t0)[None], slope(t1)[None])


def test_a_cubic_is_read_exactly():
    t = np.linspace(0.0, 3.0, 31)
    assert history().sample(t)[0] == pytest.approx(cubic(t))


def test_both_sides_of_a_jump_can_be_read():
    both = history(jump=True).sample(np.array([1.0, 1.0]), np.array([-1, 1]))[0]
    assert both == pytest.approx([cubic(1.0), cubic(1.0) + 10.0])
    assert history(jump=True).sample(np.array([1.0]))[0, 0] == pytest.approx(cubic(1.0))  # before it, unless asked


def test_an_unknown_first_slope_leaves_the_parabola():
    s = np.linspace(0, 1, 11)
    nan = np.full(11, np.nan)
    assert hermite(s, 1.0, 4.0, nan, np.full(11, 5.0)) == pytest.approx(
        1.0 + 1.0 * s + 2.0 * s**2
    )  # v(1) = 4, v'(1) = 5


def test_flows_keep_the_heat_of_the_step():
    s = np.linspace(0, 1, 2001)
    v = balanced(s, np.full(2001, 2.0), np.full(2001, 6.0), np.full(2001, 3.0))
    assert v[[0, -1]] == pytest.approx([2.0, 6.0])
    assert np.trapezoid(v, s) == pytest.approx(3.0, abs=1e-5)
    line = balanced(s, np.full(2001, np.nan), np.full(2001, 6.0), np.full(2001, 3.0))
    assert line == pytest.approx(6.0 * s)


def test_a_flow_row_is_read_by_its_mean_and_not_by_a_rate():
    h = History((Key("flow", "a"),), np.array([0.0]), np.array([2.0]), *(np.array([[v]]) for v in (2.0, 6.0, 3.0, 3.0)))
    t = np.linspace(0, 2, 2001)
    assert np.trapezoid(h.sample(t)[0], t) == pytest.approx(6.0, abs=1e-4)


def test_a_series_that_was_not_recorded_is_an_error():
    with pytest.raises(KeyError):
        history().row(Key("gauge", "b"))
    assert history().row(Key("gauge", "a")) == 0


def test_instants_outside_the_record_read_its_ends():
    assert history().sample(np.array([-1.0, 9.0]))[0] == pytest.approx([cubic(0.0), cubic(3.0)])
