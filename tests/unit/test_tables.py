"""From runs to figures."""

import numpy as np
import pytest

from fem.laws import Break, Law
from fem.results.history import Key
from fem.runs.tables import Derived, figures, rows
from fem.solve.run import run
from fem.solve.stepping import Steps
from tests.support.cases import facts_of, gauges_at
from tests.support.grids import face, problem_on, strip

KINK = 0.4


def kinked():
    """Return a bar whose ambient begins to rise fast at 0.4, and a study of it with steps far too large."""
    ambient = Law(lambda t: 300.0 + 4000.0 * np.maximum(t - KINK, 0.0), frozenset({"t"}), (Break(KINK, jump=False),))
    mesh = strip(cells=6)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(50.0, ambient))], start=300.0, end=1.0, report_every=0.1
    )
    return facts_of(mesh, problem, gauges_at((1.0, 0.0), (0.5, 0.0)), tolerance=1e3)


@pytest.fixture(scope="module")
def facts():
    return kinked()


def test_what_steps_miss_between_their_ends_is_put_back(facts):
    """The figures' values lie nearer to a march of many small steps than the cubics of the large ones do."""
    study, table = facts.study, facts.figures
    fine = Steps(
        np.unique(np.concatenate([np.linspace(a, b, 65) for a, b in ((0.0, KINK), (KINK, 1.0))])), {KINK: False}
    )
    truth = rows(run(study.finest.mesh, facts.problem, facts.gauges, tolerance=0.1, steps=fine), table.grid)[1]
    raw = rows(study.finest, table.grid)[1]
    i = table.row(Key("gauge", "g0"))
    inside = ~table.grid.ends
    assert np.abs(table.value - truth)[i, inside].max() < 0.5 * np.abs(raw - truth)[i, inside].max()
    assert (np.abs(table.value - truth)[i] <= table.band[i] + 1e-9).all()


def test_values_at_step_ends_are_those_of_the_finest_run(facts):
    table = facts.figures
    ends = table.grid.ends
    raw = rows(facts.study.finest, table.grid)[1]
    np.testing.assert_allclose(table.value[:, ends], raw[:, ends], rtol=1e-12, atol=1e-9)


def test_differences_and_rates_come_with_bands_of_their_own(facts):
    g0, g1 = Key("gauge", "g0"), Key("gauge", "g1")
    apart, fast = Key("difference", "g0 - g1"), Key("rate", "g0 over 0.2 s")
    table = figures(facts.study, facts.problem, (Derived(apart, g0, second=g1), Derived(fast, g0, over=0.2)))
    value, band = table.series(apart)
    np.testing.assert_allclose(value, table.series(g0)[0] - table.series(g1)[0], atol=1e-9)
    assert (band <= table.series(g0)[1] + table.series(g1)[1] + 1e-9).mean() > 0.5  # errors that go together cancel
    (late, wide), (before, wider) = table.at(g0, 1.0), table.at(g0, 0.8)
    rate, spread = table.at(fast, 1.0)
    assert abs(rate - (late - before) / 0.2) <= spread + (wide + wider) / 0.2
    # Each of its own: what the rate really is lies in its band.
    fine = Steps(
        np.unique(np.concatenate([np.linspace(a, b, 65) for a, b in ((0.0, KINK), (KINK, 1.0))])), {KINK: False}
    )
    exact = run(facts.study.finest.mesh, facts.problem, facts.gauges, tolerance=0.1, steps=fine).history.sample(
        np.array([0.8, 1.0])
    )[0]
    assert abs(rate - np.diff(exact)[0] / 0.2) <= spread
    early = table.grid.t < 0.2 - 1e-9
    assert np.abs(table.series(fast)[0][early]).max() < 1e-9  # there is no rate yet


def test_peaks_carry_the_band_of_the_whole_series(facts):
    peak = facts.figures.peak(Key("gauge", "g0"))
    assert peak.t == 1.0
    assert peak.value == facts.figures.at(Key("gauge", "g0"), 1.0)[0]
    assert peak.band >= facts.figures.at(Key("gauge", "g0"), 1.0)[1] * 0.999
    assert peak.t_low <= peak.t <= peak.t_high
    low = facts.figures.peak(Key("gauge", "g0"), lowest=True)
    assert low.value == pytest.approx(300.0)
    with pytest.raises(KeyError):
        facts.figures.at(Key("gauge", "g0"), 0.123456)
