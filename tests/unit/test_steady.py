"""The steady state."""

import numpy as np
import pytest

from fem.results.history import Key
from fem.solve.march import Outcome
from fem.solve.problem import STEFAN_BOLTZMANN
from fem.solve.run import run
from fem.solve.steady import solve_steady
from tests.support.cases import gauges_at
from tests.support.grids import face, problem_on, strip
from tests.support.jobs import Job, bar, posed

NONE = gauges_at()


def still(plan, faces, **how):
    return problem_on(plan, faces, begin=None, end=None, **how)


def test_it_is_where_a_long_march_ends():
    for curved in (False, True):
        mesh = bar()
        moving = posed(Job(curved=curved), mesh.plan, end=1.0)
        faces = [
            face(mesh.plan, "part 1.right", film=(2.0, 400.0)),
            face(mesh.plan, "part 1.top", flux=20.0),
            face(mesh.plan, "part 0.left", held=350.0),
        ]
        how = {"k": moving.conductivity, "source": (None, 10.0)}
        steady = solve_steady(mesh, still(mesh.plan, faces, **how), NONE, tolerance=1e-8)
        march = run(
            mesh,
            problem_on(mesh.plan, faces, rho_c=(1.0, 2.0), start=300.0, end=60.0, **how),
            NONE,
            tolerance=1e-3,
            first=1e-3,
        )
        assert steady.outcome is Outcome.finished
        np.testing.assert_allclose(
            steady.frames[-1], march.frames[-1], atol=1e-5
        )  # exp(-60) of the slowest mode is nothing


def test_flows_balance_what_is_made():
    mesh = bar()
    faces = [face(mesh.plan, "part 1.right", film=(2.0, 400.0)), face(mesh.plan, "part 0.left", held=350.0)]
    result = solve_steady(mesh, still(mesh.plan, faces, source=(None, 100.0)), NONE, tolerance=1e-8)
    flows = [result.history.v1[result.history.row(Key("flow", f.name)), 0] for f in faces]
    assert sum(flows) + 100.0 * 0.5 * 0.3 == pytest.approx(0.0, abs=1e-9)
    assert result.made[1] == pytest.approx(100.0 * 0.5 * 0.3)
    assert not any(key.kind in ("heat", "made", "stored") for key in result.history.keys)


def test_radiation_far_from_the_first_guess_is_found():
    """A heated plate that only radiates: eps sigma (T^4 - 300^4) = q."""
    mesh = strip(cells=3)
    for q in (10.0, 1e4, 1e7):
        faces = [face(mesh.plan, "part 0.left", flux=q), face(mesh.plan, "part 0.right", radiant=(0.5, 300.0))]
        result = solve_steady(mesh, still(mesh.plan, faces, k=1e6), NONE, tolerance=1e-8)
        exact = (300.0**4 + q / 0.5 / STEFAN_BOLTZMANN) ** 0.25
        right = mesh.points[:, 0] == 1.0
        assert result.outcome is Outcome.finished
        assert result.frames[-1][right] == pytest.approx([exact, exact], rel=1e-9)


def test_radiation_to_the_cold_sky_is_found_though_newton_alone_would_overshoot():
    """From 3 K Newton's first step is some 1e14 K, and every further one takes off a quarter only: damping must do it."""
    mesh, q = strip(cells=3), 1e9
    faces = [face(mesh.plan, "part 0.left", flux=q), face(mesh.plan, "part 0.right", radiant=(0.5, 3.0))]
    result = solve_steady(mesh, still(mesh.plan, faces, k=1e9), NONE, tolerance=1e-6)
    assert result.outcome is Outcome.finished
    assert result.frames[-1].max() == pytest.approx((3.0**4 + q / 0.5 / STEFAN_BOLTZMANN) ** 0.25 + q / 1e9, rel=1e-6)


@pytest.mark.parametrize("s", [100.0, 50.0])
def test_a_steep_conductivity_is_found(s):
    """k = exp(T / s), ends 300 K and 600 K: Kirchhoff's transform exp(T / s) is straight."""
    mesh = strip(cells=64)
    faces = [face(mesh.plan, "part 0.left", held=300.0), face(mesh.plan, "part 0.right", held=600.0)]
    result = solve_steady(
        mesh, still(mesh.plan, faces, k=lambda T: np.exp(T / s)), gauges_at((0.5, 0.0)), tolerance=1e-6
    )
    exact = s * np.log(0.5 * (np.exp(300.0 / s) + np.exp(600.0 / s)))
    assert result.outcome is Outcome.finished
    assert result.history.v1[0, 0] == pytest.approx(
        exact, abs=(1 / 64) ** 2 / 8 * (300.0 / s) ** 2 * 300.0
    )  # h^2/8 times the size of T''


def test_what_has_no_finite_answer_is_not_called_finished():
    """A source that is not a number: the residual can't be balanced by any temperature."""
    mesh = strip(cells=3)
    source = lambda x, y: np.where(x > 0.5, np.nan, 1.0)  # noqa: E731
    result = solve_steady(
        mesh, still(mesh.plan, [face(mesh.plan, "part 0.left", held=300.0)], source=source), NONE, tolerance=1e-8
    )
    assert result.outcome is Outcome.not_finite
