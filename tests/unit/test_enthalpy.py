"""Enthalpy against integrals known in closed form."""

import numpy as np
import pytest

from fem.laws import as_law
from fem.solve.enthalpy import CEILING, STEP, ZERO, ConstantEnthalpy, PlacedEnthalpy, TableEnthalpy, enthalpy

T = np.array([200.0, 273.15, 300.0, 812.3, 1500.0])
NOWHERE = np.zeros(len(T))


def curved(T):
    return 1e6 + 500.0 * T + 0.3 * T**2


def integral(T):
    return 1e6 * T + 250.0 * T**2 + 0.1 * T**3


@pytest.mark.parametrize("make", [lambda: TableEnthalpy(as_law(curved)), lambda: PlacedEnthalpy(as_law(curved))])
def test_heat_is_the_integral_of_the_capacity(make):
    H = make()
    exact = integral(T) - integral(ZERO)
    # Trapezium rule on rows STEP apart: c''/12 STEP^2 per kelvin (any numerical text), here 0.6/12 STEP^2.
    assert H.heat(T, NOWHERE, NOWHERE) == pytest.approx(exact, rel=1e-9, abs=0.05 * STEP**2 * 2000)
    assert H.slope(T, NOWHERE, NOWHERE) == pytest.approx(curved(T), rel=1e-9)


def test_slope_and_heat_agree_to_the_last_digits():
    H = TableEnthalpy(as_law(lambda T: 2e6 + 1e6 * np.sin(T / 20)))
    at, d = np.linspace(280.02, 900.0, 57), 1e-3
    x = np.zeros(57)
    assert (H.heat(at + d, x, x) - H.heat(at - d, x, x)) / (2 * d) == pytest.approx(H.slope(at, x, x), rel=1e-4)


def test_a_narrow_peak_keeps_its_heat():
    """A transition of 5e8 J/m3 in a triangle 4 K wide: the heat across it must be all there."""
    peak, wide = 2.5e8, 4.0

    def c(T):
        return 2e6 + peak * np.maximum(0.0, 1.0 - np.abs(T - 1008.15) / (0.5 * wide))

    H = TableEnthalpy(as_law(c))
    ends, x = np.array([1000.0, 1016.0]), np.zeros(2)
    exact = 16.0 * 2e6 + 0.5 * wide * peak
    assert np.diff(H.heat(ends, x, x))[0] == pytest.approx(exact, rel=1e-4)


def test_the_table_grows_to_where_the_march_has_been_and_stays_the_same():
    H = TableEnthalpy(as_law(curved))
    x = np.zeros(1)
    before = H.heat(np.array([400.0]), x, x)[0]
    for far in (1800.0, 40.0, 2500.0):
        H.heat(np.array([far]), x, x)
    assert H.heat(np.array([400.0]), x, x)[0] == pytest.approx(before, rel=1e-13)


def test_heat_rises_on_beyond_the_table_so_that_newton_can_come_back():
    H = TableEnthalpy(as_law(curved))
    at = np.array([-500.0, -10.0, 0.5, CEILING + 10.0, 2 * CEILING])
    x = np.zeros(len(at))
    assert (np.diff(H.heat(at, x, x)) > 0).all()
    assert (H.slope(at, x, x) > 0).all()


def test_a_capacity_that_varies_over_the_region():
    H = enthalpy(as_law(lambda x, y, T: (1.0 + x) * (2.0 + y) * T))
    x, y = np.array([0.0, 1.0, 2.0]), np.array([1.0, 0.0, 3.0])
    at = np.array([300.0, 400.0, 500.0])
    assert H.heat(at, x, y) == pytest.approx((1 + x) * (2 + y) * 0.5 * (at**2 - ZERO**2))
    assert H.slope(at, x, y) == pytest.approx((1 + x) * (2 + y) * at)


def test_the_form_follows_what_the_law_needs():
    assert isinstance(enthalpy(as_law(2e6)), ConstantEnthalpy)
    assert isinstance(enthalpy(as_law(lambda T: T)), TableEnthalpy)
    assert isinstance(enthalpy(as_law(lambda x: x)), PlacedEnthalpy)
    assert ConstantEnthalpy(2.0).heat(np.array([ZERO, ZERO + 3.0]), NOWHERE, NOWHERE) == pytest.approx([0.0, 6.0])
