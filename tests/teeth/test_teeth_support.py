"""The tests' own helpers fail where they should, and their exact solutions obey the equations."""

import numpy as np
import pytest

from fem.mesh.verify import verify
from tests.support.cases import gauges_at
from tests.support.grids import curves_of, square, strip
from tests.support.order import assert_order, observed_orders
from tests.support.series import (
    cylinder_held,
    film_roots,
    half_space_flux,
    slab_film,
    slab_flux,
    slab_held,
    sphere_held,
    two_bodies,
    two_layer_mode,
)


def falling(order, first=1.0, count=5):
    return [first * 2.0 ** (-order * i) for i in range(count)]


def test_an_order_in_the_window_passes():
    assert_order(falling(2.0), 2.0, cap=0.01)
    assert observed_orders(falling(1.5)) == pytest.approx([1.5] * 4)


@pytest.mark.parametrize(
    "errors", [falling(1.8), falling(2.4), falling(0.0), falling(2.0, count=3), [0.5, 0.1, 0.02, 0.012]]
)
def test_an_order_outside_the_window_or_of_too_few_levels_fails(errors):
    with pytest.raises(AssertionError):
        assert_order(errors, 2.0, cap=1.0)


def test_an_error_above_the_cap_fails():
    with pytest.raises(AssertionError, match="above"):
        assert_order(falling(2.0), 2.0, cap=1e-4)


def test_meshes_made_by_hand_agree_with_their_plans():
    verify(square(5, alternate=True))
    verify(strip((0.0, 0.3, 1.0), 4, rows=2))
    with pytest.raises(AssertionError):
        curves_of(strip((0.0, 0.3, 1.0), 4).plan, "part 0.right")  # between two parts
    assert gauges_at().points.shape == (0, 2)


SOLUTIONS = {
    "slab held": (lambda x, t: slab_held(x, t, half=1.0, alpha=1.0, start=1.0, held=0.0), 0),
    "slab film": (lambda x, t: slab_film(x, t, half=1.0, k=1.0, alpha=1.0, h=2.0, start=1.0, ambient=0.0), 0),
    "slab flux": (lambda x, t: slab_flux(x, t, thick=1.0, k=1.0, alpha=1.0, flux=1.0, start=0.0), 0),
    "half space": (lambda x, t: half_space_flux(x, t, k=1.0, alpha=1.0, flux=1.0, start=0.0), 0),
    "two bodies": (lambda x, t: two_bodies(x, t, k=(1.0, 1.0), rho_c=(1.0, 1.0), start=(0.0, 1.0)), 0),
    "cylinder": (lambda x, t: cylinder_held(x, t, radius=1.0, alpha=1.0, start=1.0, held=0.0), 1),
    "sphere": (lambda x, t: sphere_held(x, t, radius=1.0, alpha=1.0, start=1.0, held=0.0), 2),
}


@pytest.mark.parametrize("name", SOLUTIONS)
def test_exact_solutions_obey_the_heat_equation(name):
    """T_t = T_xx + m/x T_x with m = 0, 1, 2 for slab, cylinder, sphere; central differences err by about d^2."""
    u, m = SOLUTIONS[name]
    x, t, d = 0.6, 0.1, 1e-3
    rate = (u(x, t + d / 10) - u(x, t - d / 10)) / (d / 5)
    bend = (u(x + d, t) - 2 * u(x, t) + u(x - d, t)) / d**2 + m / x * (u(x + d, t) - u(x - d, t)) / (2 * d)
    assert rate == pytest.approx(bend, rel=1e-3)
    assert abs(rate) > 0.05


def test_exact_solutions_obey_their_edges():
    d = 1e-5
    assert slab_held(1.0, 0.1, half=1.0, alpha=1.0, start=1.0, held=7.0) == pytest.approx(7.0)

    def film(x):
        return slab_film(x, 0.1, half=1.0, k=3.0, alpha=1.0, h=2.0, start=1.0, ambient=0.0)

    assert 3.0 * (film(1.0) - film(1.0 - d)) / d == pytest.approx(-2.0 * film(1.0), rel=1e-3)

    def flux(x):
        return slab_flux(x, 0.1, thick=1.0, k=3.0, alpha=1.0, flux=5.0, start=0.0)

    assert 3.0 * (flux(1.0) - flux(1.0 - d)) / d == pytest.approx(5.0, rel=1e-3)
    assert film_roots(1.0, 1)[0] == pytest.approx(0.8603, abs=1e-4)  # Incropera and DeWitt, table 5.1


def test_the_two_layer_mode_is_continuous_and_keeps_the_flux():
    k, d = (1.0, 7.0), 1e-6
    rate, phi = two_layer_mode(k, (2.0, 0.5), (0.4, 0.6))
    left, right = (phi(0.4) - phi(0.4 - d)) / d, (phi(0.4 + d) - phi(0.4)) / d
    assert k[0] * left == pytest.approx(k[1] * right, rel=1e-4)
    assert float(phi(1.0)) == pytest.approx(0.0, abs=1e-12)
    grid = np.linspace(0.0, 1.0, 1001)[1:-1]
    assert (phi(grid) > 0).all()  # the slowest mode has no zero inside
    assert rate > 0
