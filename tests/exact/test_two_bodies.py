"""Bodies of two stocks, and bodies that are alike all through, against closed forms."""

import numpy as np
import pytest

from fem.results.history import Key
from fem.solve.problem import STEFAN_BOLTZMANN
from fem.vouch import vouch
from tests.exact.test_slab import assert_holds
from tests.support.cases import BRICK, box, docket_of, region
from tests.support.series import two_bodies

STEEL = {"conductivity": 40.0, "density": 7800.0, "specific_heat": 500.0}
TWO = {"stuff": BRICK, "steel": STEEL}


def test_two_bodies_that_touch():
    # In 30 s the wave has not reached either far end: erfc(0.1 / (2 sqrt(1e-5 30))) = 4e-5 in the steel, less in the brick.
    parts = [region("cold", box(-0.03, 0, 0, 0.01)), region("hot", box(0, 0, 0.1, 0.01), "steel", start=573.15)]
    places = {"joint": (0.0, 0.005), "in brick": (-0.004, 0.005), "in steel": (0.01, 0.005)}
    record = vouch(docket_of(parts, {}, stock=TWO, end=30.0, report=3.0, gauges=places))
    for name, (x, _) in places.items():
        assert_holds(
            record, name, lambda t, x=x: two_bodies(x, t, k=(1.0, 40.0), rho_c=(1.8e6, 3.9e6), start=(293.15, 573.15))
        )


def test_heat_is_kept_when_bodies_of_different_temperature_settle():
    # No exposure: both end at the mean weighted by rho c V.
    parts = [region("cold", box(0, 0, 0.01, 0.01)), region("hot", box(0.01, 0, 0.015, 0.01), "steel", start=573.15)]
    record = vouch(docket_of(parts, {}, stock=TWO, end=3000.0, gauges={"joint": (0.01, 0.005)}))
    heat = [1.8e6 * 0.01, 3.9e6 * 0.005]
    settled = (heat[0] * 293.15 + heat[1] * 573.15) / sum(heat)
    value, band = record.figures.at(Key("gauge", "joint"), 3000.0)
    assert abs(value - settled) <= band <= 1.0
    stored, _ = record.figures.at(Key("stored", ""), 3000.0)
    assert abs(stored) <= 1e-6 * heat[0] * 0.01 * 280.0  # nothing came in: what the ledger may leave


def test_steady_layers_in_series():
    # q = dT / (1/h + d1/k1 + d2/k2): Incropera and DeWitt, sec. 3.1.
    parts = [region("lining", box(0, 0, 0.1, 0.05)), region("shell", box(0.1, 0, 0.12, 0.05), "steel")]
    faces = {
        "kiln": {"on": ("lining.left",), "film": {"coefficient": 50.0, "ambient": 1200.0}},
        "room": {"on": ("shell.right",), "film": {"coefficient": 10.0, "ambient": 300.0}},
    }
    record = vouch(docket_of(parts, faces, stock=TWO, gauges={"joint": (0.1, 0.025), "out": (0.12, 0.01)}))
    q = 900.0 / (1 / 50.0 + 0.1 / 1.0 + 0.02 / 40.0 + 1 / 10.0)
    flow, _ = record.figures.at(Key("flow", "kiln"), 1.0)
    assert flow == pytest.approx(
        q * 0.05, rel=1e-6
    )  # linear elements are exact on straight lines: the solver's remainder is left
    for name, exact in {"joint": 1200.0 - q * (1 / 50.0 + 0.1), "out": 300.0 + q / 10.0}.items():
        value, band = record.figures.at(Key("gauge", name), 1.0)
        assert abs(value - exact) <= band <= 1.0


@pytest.mark.parametrize("shape", ["film", "radiant"])
def test_a_body_alike_all_through(shape):
    # Bi < 1e-4, so within 1e-4 of the drive: exponential decay to the ambient (Incropera and DeWitt, sec. 5.1), or, radiating to
    # surroundings at 0 K, T^-3 - T0^-3 = 3 eps sigma A t / (rho c V) (sec. 5.3).
    stock = {"copper": {"conductivity": 400.0, "density": 8900.0, "specific_heat": 385.0}}
    given = (
        {"film": {"coefficient": 8.0, "ambient": 293.15}}
        if shape == "film"
        else {"radiant": {"emissivity": 0.7, "surroundings": 0.0}}
    )
    side, end = 0.01, 1000.0
    docket = docket_of(
        [region("bar", box(0, 0, side, side), "copper")], {"air": {"on": ("bar.*",), **given}}, stock=stock, end=end, start=900.0,
        gauges={"core": (0.005, 0.005)},
    )  # fmt: skip
    record = vouch(docket)
    rate = 4 / side / (8900.0 * 385.0)

    def exact(t):
        if shape == "film":
            return 293.15 + (900.0 - 293.15) * np.exp(-8.0 * rate * t)
        return (900.0**-3 + 3 * 0.7 * STEFAN_BOLTZMANN * rate * t) ** (-1 / 3)

    value, band = record.figures.series(Key("gauge", "core"))
    biot = (8.0 if shape == "film" else 4 * 0.7 * STEFAN_BOLTZMANN * 900.0**3) * side / 2 / 400.0
    grid = record.figures.grid
    for i in np.flatnonzero(grid.reported):
        assert abs(value[i] - exact(grid.t[i])) <= band[i] + biot * 900.0
        assert band[i] <= 1.0
