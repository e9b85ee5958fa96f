"""A small record made by hand: two regions, a gauge, a jump of data, every kind of verdict, numbers not finite."""

from dataclasses import replace

import numpy as np
import pytest

from fem.results.bands import Grid
from fem.results.figures import Figures
from fem.results.findings import Finding
from fem.results.history import Key
from fem.results.ledger import Ledger
from fem.results.record import Fields, Reason, Record, RecordMesh, TurnNote
from fem.results.verdicts import Call, Verdict

HASH = "3f" * 32
KEYS = (
    Key("gauge", "beam web"),
    Key("highest", "deck"),
    Key("lowest", "deck"),
    Key("highest", ""),
    Key("flow", "kiln"),
    Key("heat", "kiln"),
    Key("stored", ""),
)


def make_figures() -> Figures:
    """Four instants, the second twice: before and after a jump at 600 s."""
    grid = Grid(
        t=np.array([0.0, 600.0, 600.0, 1200.0, 1800.0]),
        side=np.array([1, -1, 1, -1, -1]),
        origin=np.array([0.0, 0.0, 600.0, 600.0, 600.0]),
        until=np.array([600.0, 600.0, 1800.0, 1800.0, 1800.0]),
        reported=np.array([False, True, False, True, True]),
        first=np.arange(5),
        last=np.arange(5),
    )
    value = np.array(
        [
            [293.15, 300.0, 300.0, 480.0, 470.0],
            [293.15, 700.0, 700.0, 1100.0, 900.0],
            [293.15, 294.0, 294.0, 330.0, 350.0],
            [293.15, 700.0, 700.0, 1100.0, 900.0],
            [2.0e4, 1.0e4, 1.5e4, 3.0e3, -2.0e3],
            [0.0, 9.0e6, 9.0e6, 1.4e7, 1.42e7],
            [0.0, 9.0e6, 9.0e6, 1.4e7, 1.42e7],
        ]
    )
    space = 1e-3 * np.abs(value)
    space[:, 0] = 0.0
    return Figures(KEYS, grid, value, space, 0.25 * space, np.where(space > 0, 1.9, np.inf))


def make_record() -> Record:
    """A vouch that is open, with a planar section of a deck on a beam."""
    points = np.array([[0.0, 0.0], [0.1, 0.0], [0.1, 0.05], [0.0, 0.05], [0.0, -0.05], [0.1, -0.05]])
    cells = np.array([[0, 1, 2], [0, 2, 3], [4, 1, 0], [4, 5, 1]])
    mesh = RecordMesh(
        points,
        cells,
        np.array([0, 0, 1, 1]),
        ("deck", "beam"),
        np.array([[2, 3], [0, 1], [4, 5]]),
        ("deck.top", "beam.top, deck.bottom", "beam.bottom"),
    )
    T = np.linspace(293.15, 1100.0, 12).reshape(2, 6)
    times = np.array([0.0, 1800.0])
    fields = Fields(times, T, T.max(axis=0), T.min(axis=0), np.full(6, 1800.0), np.array([0.1, 0.2, 0.05, 0.4]))
    verdicts = (
        Verdict("steel keeps its strength", '"beam web" stays below 350 °C', Call.met, 143.15, 0.6, 1200.0),
        Verdict("deck soaks", '"deck" reaches 820 °C', Call.too_close, 1.0, 1.4, 1200.0, (1150.0, 1140.0, np.inf)),
        Verdict("slow enough", '"beam web" heats slower than 10 K/min', Call.not_met, -0.1, 0.002, 900.0, is_rate=True),
    )
    findings = (
        Finding("order", "differences between meshes shrink by order 1.1"),
        Finding("corner", "no finite band at a re-entrant corner", "round the corner", x=0.1, y=0.0, blocks=True),
    )
    return Record(
        kind="vouch",
        title="Deck on a steel beam",
        content_hash=HASH,
        created="2026-03-02T10:11:12+00:00",
        shelvable=True,
        versions={"heatvouch": "0.1.0", "numpy": "2.0"},
        docket_text='[docket]\nformat = 1\ntitle = "Deck on a steel beam"\r\n# a comment, µ\n',
        units=("mm", "min", "degC"),
        steady=False,
        revolution=False,
        outcome="finished",
        standing="open",
        reasons=(Reason("no finite band at a re-entrant corner", "round the corner"),),
        turns=(TurnNote("widest: gauge", "split every cell", 4, 3, 0.5), TurnNote("all within", "nothing", 16, 3, 1.5)),
        figures=make_figures(),
        verdicts=verdicts,
        findings=findings,
        ledger=Ledger((("kiln on deck.top", 1.42e7),), (("deck", 0.0),), 1.42e7, 0.5, 1.5e7),
        mesh=mesh,
        fields=fields,
        facts={"cells": [4, 16, 64], "smallest cell": 0.01, "widest": np.inf, "nested": {"a": [float("nan"), 1]}},
        seconds=1.5,
    )


@pytest.fixture
def record() -> Record:
    return make_record()


@pytest.fixture
def quick(record: Record) -> Record:
    """The same as a quick look: no band, no doubt, no verdict."""
    nothing = np.full(record.figures.value.shape, np.inf)
    figures = replace(record.figures, space=nothing, time=nothing, order=np.full(nothing.shape, np.nan))
    verdicts = tuple(replace(v, call=Call.too_close, band=np.inf) for v in record.verdicts)
    fields = replace(record.fields, doubt=np.full(4, np.nan))
    reason = Reason("a quick look makes no claim", "vouch for it")
    return replace(
        record,
        kind="quick look",
        figures=figures,
        verdicts=verdicts,
        fields=fields,
        reasons=(reason,),
        turns=(),
        findings=(),
    )
