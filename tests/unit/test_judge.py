"""Which bands a docket asks for."""

import numpy as np
import pytest

from fem.earn.judge import wanted_goals
from fem.results.figures import Figures
from fem.results.history import Key
from fem.runs.grids import steady_grid
from tests.support.cases import slab_docket

KEYS = tuple(
    Key(kind, name)
    for kind, name in (
        ("gauge", "back"), ("gauge", "near"), ("highest", "slab"), ("lowest", "slab"), ("mean", "slab"),
        ("flow", "hot"), ("heat", "hot"), ("stored", ""),
    )
)  # fmt: skip


def asked(**wanted):
    one = np.zeros((len(KEYS), 1))
    table = Figures(KEYS, steady_grid(), one, one, one, one)
    docket = slab_docket(gauges={"back": (0.0, 0.005), "near": (0.01, 0.005)}, wanted={"gauges": 0.5, **wanted})
    return {goal.key: goal.wanted for goal in wanted_goals(docket, table)}


def test_gauges_are_always_asked_for():
    assert asked() == {Key("gauge", "back"): 0.5, Key("gauge", "near"): 0.5}


@pytest.mark.parametrize(
    ("field", "keys"),
    [
        ("regions", {("highest", "slab"), ("lowest", "slab")}),
        ("means", {("mean", "slab")}),
        ("heat", {("flow", "hot")}),
        ("stored", {("stored", "")}),
    ],
)
def test_each_kind_of_band_asks_for_its_own_series(field, keys):
    more = {key: band for key, band in asked(**{field: 0.25}).items() if key.kind != "gauge"}
    assert {(key.kind, key.name) for key in more} == keys
    assert set(more.values()) == {0.25}
