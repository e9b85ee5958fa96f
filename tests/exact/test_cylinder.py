"""Whole vouches of bodies of revolution, and of discs drawn with arcs, against closed forms."""

import numpy as np
import pytest

from fem.results.history import Key
from fem.vouch import vouch
from tests.exact.test_slab import ALPHA, assert_holds
from tests.support.cases import box, docket_of, region
from tests.support.series import cylinder_held, sphere_held

R, END = 0.03, 400.0


def test_a_cylinder_drawn_as_a_body_of_revolution():
    places = {"axis": (0.0, 0.005), "half way": (0.015, 0.005)}
    docket = docket_of(
        [region("rod", box(0, 0, R, 0.01))],
        {"bath": {"on": ("rod.right",), "held": 373.15}},
        kind="revolution",
        end=END,
        gauges=places,
    )
    record = vouch(docket)
    for name, (r, _) in places.items():
        assert_holds(record, name, lambda t, r=r: cylinder_held(r, t, radius=R, alpha=ALPHA, start=293.15, held=373.15))
    stored, band = record.figures.at(Key("stored", ""), END)
    assert band < stored
    assert stored <= 80.0 * 1.8e6 * np.pi * R**2 * 0.01 * (1 + 1e-9)  # the most that the full turn can take up


def test_a_cylinder_drawn_as_a_planar_disc():
    disc = [{"x": R, "y": 0.0, "edge": "skin", "via": (0.0, R)}, {"x": -R, "y": 0.0, "edge": "skin", "via": (0.0, -R)}]
    places = {"centre": (0.0, 0.0), "half way": (0.0, -0.015)}
    record = vouch(
        docket_of([region("disc", disc)], {"bath": {"on": ("disc.skin",), "held": 373.15}}, end=END, gauges=places)
    )
    for name, (x, y) in places.items():
        r = np.hypot(x, y)
        assert_holds(record, name, lambda t, r=r: cylinder_held(r, t, radius=R, alpha=ALPHA, start=293.15, held=373.15))


def test_a_sphere():
    s = R / np.sqrt(2.0)
    ball = [
        {"x": 0.0, "y": -R, "edge": "skin", "via": (s, -s)},
        {"x": R, "y": 0.0, "edge": "skin", "via": (s, s)},
        {"x": 0.0, "y": R},
    ]
    places = {"centre": (0.0, 0.0), "off the axis": (0.012, 0.009)}
    record = vouch(
        docket_of(
            [region("ball", ball)],
            {"bath": {"on": ("ball.skin",), "held": 373.15}},
            kind="revolution",
            end=END,
            gauges=places,
        )
    )
    for name, (x, y) in places.items():
        r = np.hypot(x, y)
        assert_holds(record, name, lambda t, r=r: sphere_held(r, t, radius=R, alpha=ALPHA, start=293.15, held=373.15))


def test_steady_heat_through_a_pipe():
    # Q = 2 pi k L dT / ln(r2/r1): Incropera and DeWitt, sec. 3.3.
    pipe = region("pipe", box(0.05, 0, 0.1, 0.02))
    faces = {"inside": {"on": ("pipe.left",), "held": 400.0}, "outside": {"on": ("pipe.right",), "held": 300.0}}
    record = vouch(docket_of([pipe], faces, kind="revolution", gauges={"wall": (0.07, 0.01)}))
    exact = 2 * np.pi * 1.0 * 0.02 * 100.0 / np.log(2.0)
    flow, band = record.figures.at(Key("flow", "inside"), 1.0)
    assert abs(flow - exact) <= band <= 0.02 * exact
    out, _ = record.figures.at(Key("flow", "outside"), 1.0)
    assert out == pytest.approx(-flow, rel=1e-9)
    value, band = record.figures.at(Key("gauge", "wall"), 1.0)
    assert abs(value - 400.0 + 100.0 * np.log(0.07 / 0.05) / np.log(2.0)) <= band <= 1.0


def test_the_turn_of_a_cone_has_its_volume():
    # Stored heat of a body that warms uniformly by a source: g t V, V = pi R^2 H / 3 of a cone (Euclid, book XII).
    cone = [{"x": 0.0, "y": 0.0}, {"x": 0.03, "y": 0.0}, {"x": 0.0, "y": 0.04}]
    record = vouch(
        docket_of([region("cone", cone, source=1e5)], {}, kind="revolution", end=100.0, gauges={"in": (0.005, 0.01)})
    )
    stored, _ = record.figures.at(Key("stored", ""), 100.0)
    assert stored == pytest.approx(1e5 * 100.0 * np.pi * 0.03**2 * 0.04 / 3, rel=1e-6)  # what the ledger may leave
    value, _ = record.figures.at(Key("gauge", "in"), 100.0)
    assert value == pytest.approx(293.15 + 1e5 * 100.0 / 1.8e6, abs=1e-6)
