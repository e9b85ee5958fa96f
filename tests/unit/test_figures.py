"""Figures read off series made by hand."""

import numpy as np
import pytest

from fem.checks.facts import Goal
from fem.results.bands import Grid
from fem.results.figures import Figures
from fem.results.history import Key

KEY = Key("gauge", "a")


def table(value, space, time=0.0):
    n = len(value)
    t = np.arange(n, dtype=float)
    reported = t % 2 == 1
    grid = Grid(t, -np.ones(n, dtype=int), np.zeros(n), np.full(n, n - 1.0), reported, np.arange(n), np.arange(n))
    row = np.zeros((1, n))
    return Figures((KEY,), grid, row + value, row + space, row + time, row + 2.0)


def test_a_peak_is_as_unsure_as_the_highest_that_any_instant_may_be():
    peak = table([1.0, 10.0, 9.0], [0.1, 0.1, 5.0]).peak(KEY)
    assert (peak.value, peak.t) == (10.0, 1.0)
    assert peak.band == pytest.approx(4.0)  # 9 + 5 may be 14
    assert (peak.t_low, peak.t_high) == (1.0, 2.0)


def test_a_lowest_value_mirrors_it():
    peak = table([-1.0, -10.0, -9.0], [0.1, 0.1, 5.0]).peak(KEY, lowest=True)
    assert (peak.value, peak.band, peak.t) == (-10.0, pytest.approx(4.0), 1.0)


def test_without_a_band_a_peak_may_be_anywhere():
    peak = table([1.0, 3.0, 2.0], [np.inf] * 3).peak(KEY)
    assert peak.band == np.inf
    assert (peak.t_low, peak.t_high) == (0.0, 2.0)


def test_space_and_time_add_up():
    figures = table([1.0, 2.0], [0.5, 0.25], [0.125, 0.5])
    assert list(figures.band[0]) == [0.625, 0.75]
    assert figures.at(KEY, 1.0) == (2.0, 0.75)
    with pytest.raises(KeyError):
        figures.at(KEY, 0.5)
    with pytest.raises(KeyError):
        figures.row(Key("gauge", "b"))


def test_goals_count_reporting_times_or_every_instant_of_their_span():
    figures = table(np.zeros(6), np.zeros(6))
    assert list(figures.grid.t[Goal(KEY, 1.0, "w").counts(figures)]) == [1.0, 3.0, 5.0]
    assert list(figures.grid.t[Goal(KEY, 1.0, "w", 2.0, 4.0).counts(figures)]) == [3.0]
    assert list(figures.grid.t[Goal(KEY, 1.0, "w", 2.0, 4.0, everywhere=True).counts(figures)]) == [2.0, 3.0, 4.0]
