"""Two-dimensional conduction against closed forms."""

import numpy as np

from fem.docket import Wanted
from fem.results.history import Key
from fem.vouch import vouch
from tests.exact.test_slab import ALPHA, assert_holds
from tests.support.cases import box, docket_of, region
from tests.support.series import slab_held

TERMS = 101


def test_a_bar_quenched_on_all_sides():
    # Product of two slabs (Carslaw and Jaeger, ch. V; Incropera and DeWitt, sec. 5.8).
    a, b = 0.02, 0.03
    docket = docket_of(
        [region("bar", box(-a, -b, a, b))], {"bath": {"on": ("bar.*",), "held": 293.15}}, end=300.0, start=393.15,
        gauges={"core": (0.0, 0.0), "off": (0.008, -0.011)},
    )  # fmt: skip
    record = vouch(docket)

    def exact(x, y, t):
        return 293.15 + 100.0 * slab_held(x, t, half=a, alpha=ALPHA, start=1, held=0) * slab_held(
            y, t, half=b, alpha=ALPHA, start=1, held=0
        )

    assert_holds(record, "core", lambda t: exact(0.0, 0.0, t))
    assert_holds(record, "off", lambda t: exact(0.008, -0.011, t))


def test_a_square_with_one_hot_side():
    # Sum over odd n of 4/(n pi) sinh(n pi y)/sinh(n pi) sin(n pi x): Incropera and DeWitt, sec. 4.2.
    faces = {
        "cold": {"on": ("box.left", "box.right", "box.bottom"), "held": 300.0},
        "hot": {"on": ("box.top",), "held": 400.0},
    }
    places = {"middle": (0.5, 0.5), "high": (0.3, 0.8)}
    record = vouch(docket_of([region("box", box(0, 0, 1, 1))], faces, gauges=places, wanted=Wanted(gauges=0.5)))
    n = np.arange(1, TERMS, 2)
    for name, (x, y) in places.items():
        exact = 300.0 + 100.0 * float(
            (4 / (n * np.pi) * np.sinh(n * np.pi * y) / np.sinh(n * np.pi) * np.sin(n * np.pi * x)).sum()
        )
        value, band = record.figures.at(Key("gauge", name), 1.0)
        assert abs(value - exact) <= band <= 0.5
    assert any("has no finite value there" in f.message for f in record.findings)  # where the held temperatures meet
