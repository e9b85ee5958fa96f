"""Whole vouches of slabs against closed forms: the band holds the exact value, and is as narrow as was asked for."""

import numpy as np
import pytest

from fem.results.history import Key
from fem.solve.problem import STEFAN_BOLTZMANN
from fem.vouch import vouch
from tests.support.cases import BRICK, box, docket_of, region, slab_docket
from tests.support.series import half_space_flux, slab_film, slab_flux, slab_held

THICK, K, ALPHA = 0.04, 1.0, 1.0 / 1.8e6
PLACES = {"back": (0.0, 0.005), "middle": (0.02, 0.005), "near": (0.035, 0.005)}


def assert_holds(record, gauge, exact, wanted=1.0):
    """Fail unless at every reporting time the band holds the exact value and is at most the wanted one."""
    assert record.outcome == "finished"
    figures = record.figures
    value, band = figures.series(Key("gauge", gauge))
    for i in np.flatnonzero(figures.grid.reported):
        error = abs(value[i] - exact(figures.grid.t[i]))
        assert error <= band[i] <= wanted, f"{gauge} at {figures.grid.t[i]:g} s: error {error:.3g}, band {band[i]:.3g}"


def test_held_surface():
    record = vouch(slab_docket(gauges=PLACES))
    assert record.standing == "vouched"
    for name, (x, _) in PLACES.items():
        assert_holds(record, name, lambda t, x=x: slab_held(x, t, half=THICK, alpha=ALPHA, start=293.15, held=373.15))


def test_film():
    h = 60.0
    record = vouch(
        slab_docket(
            gauges=PLACES, exposures={"kiln": {"on": ("slab.right",), "film": {"coefficient": h, "ambient": 1073.15}}}
        )
    )
    for name, (x, _) in PLACES.items():
        assert_holds(
            record,
            name,
            lambda t, x=x: slab_film(x, t, half=THICK, k=K, alpha=ALPHA, h=h, start=293.15, ambient=1073.15),
        )


def test_constant_flux():
    record = vouch(slab_docket(gauges=PLACES, exposures={"lamp": {"on": ("slab.right",), "flux": 5000.0}}))
    for name, (x, _) in PLACES.items():
        assert_holds(
            record, name, lambda t, x=x: slab_flux(x, t, thick=THICK, k=K, alpha=ALPHA, flux=5000.0, start=293.15)
        )
    heat, band = record.figures.at(Key("heat", "lamp"), 600.0)
    assert abs(heat - 5000.0 * 600.0 * 0.01) <= 1e-9 * heat  # a flux is integrated exactly
    assert band >= 0.0


def test_half_space_with_flux():
    # 0.04 m back the wave has fallen by erfc(0.04 / (2 sqrt(alpha t))) < 1e-4 at 40 s: the slab is a half space until then.
    record = vouch(
        slab_docket(
            end=40.0, gauges={"near": (0.035, 0.005)}, exposures={"lamp": {"on": ("slab.right",), "flux": 20000.0}}
        )
    )
    assert_holds(record, "near", lambda t: half_space_flux(0.005, t, k=K, alpha=ALPHA, flux=20000.0, start=293.15))


def test_steady_source():
    # T = T0 + g (L^2 - x^2) / (2 k), insulated at 0, held at L; Incropera and DeWitt, sec. 3.5.
    docket = docket_of(
        [region("slab", box(0, 0, THICK, 0.01), source=1e5)],
        {"cold": {"on": ("slab.right",), "held": 300.0}},
        gauges=PLACES,
    )
    record = vouch(docket)
    assert record.standing == "vouched"
    for name, (x, _) in PLACES.items():
        value, band = record.figures.at(Key("gauge", name), 1.0)
        assert abs(value - 300.0 - 1e5 * (THICK**2 - x**2) / 2 / K) <= band <= 1.0
    flow, band = record.figures.at(Key("flow", "cold"), 1.0)
    assert flow == pytest.approx(-1e5 * THICK * 0.01, rel=1e-9)  # the residual's flow is exactly conservative


def test_steady_conductivity_over_temperature():
    # k = 1 + 0.002 (T - 300): Kirchhoff's transform, theta = (T - 300) + 0.001 (T - 300)^2, is straight (Carslaw and Jaeger, ch. I).
    stock = {"stuff": {**BRICK, "conductivity": lambda T: 1.0 + 0.002 * (T - 300.0)}}
    faces = {"cold": {"on": ("slab.left",), "held": 300.0}, "hot": {"on": ("slab.right",), "held": 1300.0}}
    record = vouch(docket_of([region("slab", box(0, 0, THICK, 0.01))], faces, stock=stock, gauges=PLACES))
    whole = 1000.0 + 0.001 * 1000.0**2
    for name, (x, _) in PLACES.items():
        theta = whole * x / THICK
        exact = 300.0 + (-1.0 + np.sqrt(1.0 + 0.004 * theta)) / 0.002
        value, band = record.figures.at(Key("gauge", name), 1.0)
        assert abs(value - exact) <= band <= 1.0
    flow, band = record.figures.at(Key("flow", "hot"), 1.0)
    assert abs(flow - whole / THICK * 0.01) <= band + 1e-6 * flow  # the heat that Newton may leave, as in the ledger


def test_steady_radiation_and_film_in_balance():
    # k dT/dx through the slab = eps sigma (Ts^4 - T^4) + h (Ta - T) at its face: one equation in one unknown, solved by bisection.
    fire = {"radiant": {"emissivity": 0.8, "surroundings": 1100.0}, "film": {"coefficient": 25.0, "ambient": 1000.0}}
    faces = {"cold": {"on": ("slab.left",), "held": 300.0}, "fire": {"on": ("slab.right",), **fire}}
    record = vouch(docket_of([region("slab", box(0, 0, THICK, 0.01))], faces, gauges={"face": (THICK, 0.005)}))
    low, high = 300.0, 1100.0
    for _ in range(60):
        T = 0.5 * (low + high)
        surplus = 0.8 * STEFAN_BOLTZMANN * (1100.0**4 - T**4) + 25.0 * (1000.0 - T) - K * (T - 300.0) / THICK
        low, high = (T, high) if surplus > 0 else (low, T)
    value, band = record.figures.at(Key("gauge", "face"), 1.0)
    assert (
        abs(value - low) <= band + 1e-6
    )  # linear elements are exact on a straight line: only Newton's remainder is left


def test_a_film_that_holds_no_heat_back_is_a_held_surface():
    # Bi -> infinity: the film's solution tends to the held one with an error of order 1/Bi (both series above).
    h = 1e7
    record = vouch(
        slab_docket(exposures={"bath": {"on": ("slab.right",), "film": {"coefficient": h, "ambient": 373.15}}})
    )
    slack = 80.0 * K / (h * THICK)
    value, band = record.figures.at(Key("gauge", "back"), 600.0)
    assert abs(value - slab_held(0.0, 600.0, half=THICK, alpha=ALPHA, start=293.15, held=373.15)) <= band + slack
