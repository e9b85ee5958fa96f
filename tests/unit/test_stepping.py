"""The tableau against the order conditions, and the ladder of steps."""

import itertools

import numpy as np
import pytest

from fem.laws import Break
from fem.solve.stepping import INSIDE, SDIRK4, Ladder, Steps


def test_the_tableau_obeys_the_conditions_of_order_four():
    """Hairer, Norsett and Wanner, Solving Ordinary Differential Equations I, 2nd ed., table II.2.1."""
    A, c = SDIRK4.A, SDIRK4.c
    b = A[-1]
    assert A.sum(axis=1) == pytest.approx(c)
    conditions = {
        "1": (b.sum(), 1), "c": (b @ c, 1 / 2), "c2": (b @ c**2, 1 / 3), "Ac": (b @ A @ c, 1 / 6), "c3": (b @ c**3, 1 / 4),
        "cAc": ((b * c) @ A @ c, 1 / 8), "Ac2": (b @ A @ c**2, 1 / 12), "AAc": (b @ A @ A @ c, 1 / 24),
    }  # fmt: skip
    for name, (value, wanted) in conditions.items():
        assert value == pytest.approx(wanted, abs=1e-14), name


def test_the_embedded_method_is_of_order_three_and_not_four():
    A, c, other = SDIRK4.A, SDIRK4.c, SDIRK4.A[-1] - SDIRK4.error
    for value, wanted in ((other.sum(), 1), (other @ c, 1 / 2), (other @ c**2, 1 / 3), (other @ A @ c, 1 / 6)):
        assert value == pytest.approx(wanted, abs=1e-14)
    assert abs(other @ c**3 - 1 / 4) > 1e-3


def test_the_method_is_stable_and_damps_stiff_parts_at_once():
    """L-stable: |R(z)| <= 1 on the left half plane and R(-infinity) = 0 (Hairer and Wanner II, sec. IV.3 and IV.6)."""
    one = np.ones(5)

    def growth(z):
        return 1 + z * SDIRK4.A[-1] @ np.linalg.solve(np.eye(5) - z * SDIRK4.A, one)

    for y in np.linspace(0, 50, 201):
        assert abs(growth(1j * y)) <= 1 + 1e-12
    assert abs(growth(-1e8)) < 1e-7
    assert all(
        growth(-x) > -0.1 for x in np.geomspace(0.01, 1e4, 200)
    )  # hardly any change of sign: a quench does not ring


def test_stage_times_stay_inside_the_step():
    times = SDIRK4.instants(100.0, 10.0)
    assert all(100.0 < t < 110.0 for t in times)
    assert times[-1] == pytest.approx(110.0 - 10.0 * INSIDE, abs=1e-9)
    assert times[:4] == pytest.approx([102.5, 107.5, 105.5, 105.0])


def climb(ladder, error=lambda t0, t1: 0.0, tolerance=1.0):
    times = [ladder.now]
    while not ladder.done:
        t0, t1 = ladder.now, ladder.next
        if error(t0, t1) > tolerance:
            assert ladder.reject()
            continue
        times.append(t1)
        ladder.accept(grow=error(t0, t1) < 0.05 * tolerance)
    return np.array(times)


BREAKS = (Break(0.3, jump=False), Break(0.7, jump=True))


def test_every_break_is_landed_on_exactly():
    times = climb(Ladder(0.0, 1.0, BREAKS, first=0.01))
    assert {0.0, 0.3, 0.7, 1.0} <= set(times)
    assert (np.diff(times) > 0).all()


def test_steps_are_dyadic_parts_of_their_stretch_and_begin_small():
    times = climb(Ladder(0.0, 1.0, BREAKS, first=0.01))
    edges = np.array([0.0, 0.3, 0.7, 1.0])
    for t0, t1 in itertools.pairwise(times):
        i = int(np.searchsorted(edges, t1 - 1e-12)) - 1
        length = edges[i + 1] - edges[i]
        power = np.log2(length / (t1 - t0))
        assert power == pytest.approx(round(power), abs=1e-6)
        assert (t0 - edges[i]) / (t1 - t0) == pytest.approx(round((t0 - edges[i]) / (t1 - t0)), abs=1e-6)
    assert times[1] - times[0] <= 0.01
    after = times[np.searchsorted(times, 0.7) + 1] - 0.7
    assert after <= 0.01  # small again after a jump
    kink = times[np.searchsorted(times, 0.3) + 1] - 0.3
    assert kink > 0.01  # not after a kink


def test_steps_follow_the_error():
    times = climb(Ladder(0.0, 1.0, (), first=1.0), error=lambda t0, t1: (t1 - t0) / (0.01 if t0 < 0.5 else 1.0))
    sizes = np.diff(times)
    assert sizes[times[:-1] < 0.5].max() <= 0.01
    assert sizes[times[:-1] >= 0.6].max() > 0.02


def test_a_ladder_has_a_last_rung():
    ladder = Ladder(0.0, 1.0, (), first=1.0)
    count = 0
    while ladder.reject():
        count += 1
    assert count == Ladder.DEEPEST
    assert ladder.next > ladder.now


def test_halving_keeps_times_and_breaks():
    steps = Steps(np.array([0.0, 1.0, 3.0]), {1.0: True})
    assert list(steps.halved().times) == [0.0, 0.5, 1.0, 2.0, 3.0]
    assert steps.halved().breaks == {1.0: True}
    some = steps.halved_where(np.array([False, True]))
    assert list(some.times) == [0.0, 1.0, 2.0, 3.0]
    assert len(steps) == 2
    assert len(some) == 3
