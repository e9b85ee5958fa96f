"""One march: what it yields, where it lands, what it counts."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import expm

from fem.laws import Break, Law
from fem.results.history import Key
from fem.solve.conduction import Conduction
from fem.solve.march import March, Outcome
from fem.solve.run import run
from fem.solve.stepping import Steps
from tests.support.cases import gauges_at
from tests.support.grids import face, problem_on, strip
from tests.support.jobs import Job, bar, posed, solved

NONE = gauges_at()


def jumping(kind, low=300.0, high=400.0):
    law = Law(lambda t: np.where(t < 0.4, low, high), frozenset({"t"}), (Break(0.4, jump=True),))
    mesh = strip(cells=5)
    given = {"held": law} if kind == "held" else {"film": (5.0, law)}
    return mesh, problem_on(mesh.plan, [face(mesh.plan, "part 0.right", **given)], start=low, end=1.0, report_every=0.1)


@pytest.mark.parametrize("kind", ["held", "film"])
def test_nothing_is_felt_before_a_jump(kind):
    """The value after the jump must not leak into the step before it."""
    mesh, problem = jumping(kind)
    for step in March(Conduction(mesh, problem), tolerance=0.1, first=0.01):
        if step.t1 <= 0.4:
            assert pytest.approx(np.full(len(mesh.points), 300.0), abs=1e-9) == step.T1
        elif step.t0 >= 0.4:
            assert step.T1.max() > 300.0


def test_a_held_node_has_its_new_value_right_after_the_jump():
    mesh, problem = jumping("held")
    right = mesh.points[:, 0] == 1.0
    steps = list(March(Conduction(mesh, problem), tolerance=0.1, first=0.01))
    (first,) = [s for s in steps if s.t0 == 0.4]
    assert first.T0[right] == pytest.approx([400.0, 400.0])
    assert first.d0 is None
    height = np.ptp(mesh.points[:, 1])
    assert first.impulse[0] == pytest.approx(100.0 * 0.1 * height)  # half a cell of 0.2 m taken 100 K up
    assert sum(s.impulse[0] for s in steps) == pytest.approx(first.impulse[0])


def test_steps_join_and_end_at_the_end():
    mesh, problem = jumping("film")
    march = March(Conduction(mesh, problem), tolerance=0.1, first=0.01)
    steps = list(march)
    assert march.outcome is Outcome.finished
    assert [s.t1 for s in steps[:-1]] == [s.t0 for s in steps[1:]]
    assert (steps[0].t0, steps[-1].t1) == (0.0, 1.0)
    assert 0.4 in [s.t1 for s in steps]


def test_a_march_that_nobody_finishes_says_so():
    mesh, problem = jumping("film")
    march = March(Conduction(mesh, problem), tolerance=0.1, first=0.01)
    next(iter(march))
    assert march.outcome is Outcome.stopped


@pytest.mark.parametrize("kind", ["held", "film"])
def test_a_replay_takes_the_same_steps_to_the_same_end(kind):
    mesh, problem = jumping(kind)
    first = run(mesh, problem, NONE, tolerance=0.1, first=0.01)
    again = run(mesh, problem, NONE, tolerance=0.1, steps=first.steps)
    assert list(again.steps.times) == list(first.steps.times)
    np.testing.assert_allclose(again.frames[-1], first.frames[-1], rtol=1e-12)
    np.testing.assert_allclose(again.face_heat, first.face_heat, rtol=1e-9)
    np.testing.assert_allclose(
        again.history.v0, first.history.v0, rtol=1e-9, atol=1e-9
    )  # with the same gaps where flows are infinite


def test_a_tighter_tolerance_takes_more_steps():
    mesh, problem = jumping("film")
    counts = [len(run(mesh, problem, NONE, tolerance=tolerance, first=0.01).steps) for tolerance in (1.0, 1e-2, 1e-4)]
    assert counts[0] < counts[1] < counts[2]


@pytest.mark.parametrize("held", [False, True])
def test_the_short_way_for_linear_problems_gives_what_newton_gives(held):
    """The same problem, once with a conductivity that merely claims to depend on temperature."""
    mesh = bar()
    short = posed(Job(), mesh.plan)
    if not held:
        short = replace(short, faces=tuple(f for f in short.faces if f.held is None))
    long = replace(short, conductivity=tuple(Law(lambda T, k=k: k + 0.0 * T, frozenset({"T"})) for k in (1.0, 3.0)))
    assert Conduction(mesh, short).linear
    assert not Conduction(mesh, long).linear
    one, two = (solved(mesh, p, points=[(0.3, 0.1)]) for p in (short, long))
    # Newton stops at 1e-6 of the tolerance of 1e-3 K per stage, 12 steps of 5 stages.
    np.testing.assert_allclose(two.frames, one.frames, atol=1e-7)
    np.testing.assert_allclose(two.face_heat, one.face_heat, rtol=1e-6, atol=1e-6 * one.exchanged)
    np.testing.assert_allclose(two.made, one.made, rtol=1e-9)
    for a, b in ((one.history.v1, two.history.v1), (one.history.d1, two.history.d1)):
        np.testing.assert_allclose(b, a, rtol=1e-4, atol=1e-4)


def test_rates_at_step_ends_are_those_of_the_solution():
    """Between steps histories are cubics: a wrong rate would show there. exp(-a t) of the first mode of the bar."""
    mesh = strip(cells=40)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", held=0.0)], start=lambda x, y: np.cos(0.5 * np.pi * x), end=0.5
    )
    result = run(mesh, problem, gauges_at((0.0, 0.0)), tolerance=1e-4, steps=Steps(np.linspace(0, 0.5, 9)))
    a = (np.pi / 2) ** 2
    row = result.history.row(Key("gauge", "g0"))
    rate = result.history.d1[row][1:]  # in the first step the ends, where nodes own one cell or two, still settle
    assert rate == pytest.approx(-a * np.exp(-a * result.history.t1[1:]), rel=2 * (np.pi / 2 / 40) ** 2 + 1e-3)
    middle = 0.5 * (result.history.t0 + result.history.t1)[1:]
    exact = np.exp(-a * middle)
    # A cubic through both ends with both rates errs by (dt)^4 / 384 of the fourth derivative (any numerical text), the mesh by h^2 / 12.
    slack = (0.5 / 8) ** 4 / 384 * a**4 + a * 0.5 * (np.pi / 2 / 40) ** 2 / 12
    assert np.abs(result.history.sample(middle)[row] - exact).max() < 2 * slack


def test_flows_and_heats_of_a_film():
    """Flow in is h (ambient - T) at both ends of every step; heat is its sum over time; both rows and totals agree."""
    mesh, problem = jumping("film")
    height = np.ptp(mesh.points[:, 1])
    result = run(mesh, problem, gauges_at((1.0, 0.0), (1.0, height)), tolerance=1e-3, first=0.01)
    h = result.history
    surface = 0.5 * (h.v1[h.row(Key("gauge", "g0"))] + h.v1[h.row(Key("gauge", "g1"))])
    flow, heat = (h.row(Key(kind, "part 0.right")) for kind in ("flow", "heat"))
    ambient = np.where(h.t1 <= 0.4, 300.0, 400.0)
    assert h.v1[flow] == pytest.approx(5.0 * (ambient - surface) * height, abs=1e-9)
    assert h.v1[heat, -1] == pytest.approx(result.face_heat[0])
    assert np.diff(h.v1[heat]) == pytest.approx((h.v1[heat] - h.v0[heat])[1:])
    stored = h.v1[h.row(Key("stored", "")), -1]
    assert stored == pytest.approx(result.stored)
    assert stored == pytest.approx(result.face_heat[0], rel=1e-9)


def test_peaks_and_lows_are_those_of_all_steps():
    mesh, problem = jumping("film")
    result = run(mesh, problem, NONE, tolerance=0.1, first=0.01)
    high = result.history.v1[result.history.row(Key("highest", "part 0"))]
    assert result.peak.max() == pytest.approx(high.max())
    assert result.low.min() == pytest.approx(300.0)
    assert result.peak_time[np.argmax(result.peak)] == 1.0
    frames = result.frames[result.frame_times == 1.0]
    assert frames.shape == (1, len(mesh.points))


@pytest.mark.parametrize("tolerance", [1.0, 1e-2, 1e-4])
def test_no_step_errs_by_more_than_its_tolerance(tolerance):
    """Each step against the matrix exponential from where it began; as the quench dies out steps grow, and few are tried in vain."""
    mesh = strip(cells=12)
    problem = problem_on(mesh.plan, [face(mesh.plan, "part 0.right", film=(50.0, 800.0))], start=300.0, end=2.0)
    c = Conduction(mesh, problem)
    matrix = c.stiffness(0.0, c.start()).toarray() + np.diag(c.loads(0.0, c.start()).slope)
    rates = -matrix / c.capacity(c.start())[:, None]
    march = March(c, tolerance=tolerance, first=1e-3)
    steps = list(march)
    for step in steps:
        exact = 800.0 + expm((step.t1 - step.t0) * rates) @ (step.T0 - 800.0)
        assert np.abs(step.T1 - exact).max() <= tolerance
    sizes = [step.t1 - step.t0 for step in steps]
    assert max(sizes) >= 16 * sizes[0]
    assert march.rejected <= 0.2 * len(steps)


def test_after_a_held_jump_only_the_flow_of_that_face_is_unknown():
    """The film's flow right after the jump is known: its coefficient times the difference, which nothing has changed yet."""
    mesh = strip(cells=4)
    law = Law(lambda t: np.where(t < 0.4, 300.0, 400.0), frozenset({"t"}), (Break(0.4, jump=True),))
    faces = [face(mesh.plan, "part 0.left", held=law), face(mesh.plan, "part 0.right", film=(2.0, 350.0))]
    problem = problem_on(mesh.plan, faces, start=300.0, end=1.0)
    history = run(mesh, problem, gauges_at(), tolerance=0.1, first=0.01).history
    held, film = (history.row(Key("flow", f.name)) for f in faces)
    after = int(np.flatnonzero(history.t0 == 0.4)[0])
    assert np.isnan(history.v0[held, after])
    assert history.v0[film, after] == pytest.approx(history.v1[film, after - 1], rel=1e-6)


def test_newton_keeps_its_digits_in_a_good_conductor():
    """Conduction is reckoned from differences of temperature: Newton reaches 6e-11 K at 1000 K, though k is 1e7 times the film's worth."""
    mesh = strip(cells=4)
    faces = [face(mesh.plan, "part 0.left", radiant=(0.8, 300.0))]
    problem = problem_on(mesh.plan, faces, k=2e8, rho_c=1e3, start=1000.0, end=1.0)
    result = run(mesh, problem, gauges_at(), tolerance=2e-5, steps=Steps(np.linspace(0.0, 1.0, 9)))
    assert result.outcome is Outcome.finished
    assert abs(result.face_heat.sum() - result.stored) <= 1e-9 * abs(result.stored)
