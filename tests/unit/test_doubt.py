"""Which cell, and which step, owes."""

from dataclasses import replace

import numpy as np
import pytest

from fem.results.history import Key
from fem.runs.doubt import cell_doubt, map_doubt, node_doubt, parents_max, passes_needed, step_doubt
from fem.runs.study import split_cells
from tests.support.cases import facts_of, gauges_at
from tests.support.grids import face, problem_on, strip


def study():
    mesh = strip(cells=6)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", held=400.0)], start=300.0, end=0.05, report_every=0.01
    )
    return facts_of(mesh, problem, gauges_at((0.5, 0.0))).study


def test_a_quench_owes_most_where_it_bites():
    s = study()
    worst = cell_doubt(s).max(axis=0)
    x = s.levels[0].mesh.points[s.levels[0].mesh.cells].mean(axis=1)[:, 0]
    assert x[np.argmax(worst)] > 0.8
    assert worst[x < 0.3].max() < 0.2 * worst.max()
    assert map_doubt(s).max() == pytest.approx(worst.max())
    by_hand = np.abs(s.levels[2].frames[:, : len(s.levels[1].mesh.points)] - s.levels[1].frames).max(axis=0)
    assert np.array_equal(node_doubt(s), by_hand)
    assert by_hand.max() > 0.0


def test_a_planted_difference_is_found_in_its_own_cell():
    s = study()
    fine = s.finest
    frames = fine.frames.copy()
    cell = 4 + 2 * 4 * len(s.levels[0].mesh.cells) // 4  # some cell of the finest mesh
    middle = set(fine.mesh.cells[cell]) - set(np.unique(fine.mesh.cells[:cell]))
    node = next(iter(middle), fine.mesh.cells[cell][0])
    frames[:, node] += 1000.0
    planted = replace(s, levels=(*s.levels[:-1], replace(fine, frames=frames)))
    hit = np.flatnonzero((fine.mesh.cells == node).any(axis=1))
    expected = set(hit % len(s.levels[0].mesh.cells))  # children of cell i are i, i + M, i + 2M, i + 3M, twice over
    assert set(np.flatnonzero(cell_doubt(planted).max(axis=0) > 500.0)) == expected


def test_the_largest_of_four_children():
    assert list(parents_max(np.array([1.0, 2.0, 5.0, 0.0, 3.0, 9.0, 0.0, 4.0]))) == [5.0, 9.0]


def test_passes_follow_a_factor_of_four_per_split():
    assert list(passes_needed(np.array([0.0, 0.9, 1.0, 1.1, 4.0, 4.1, 16.0, 1e9]), 1.0)) == [0, 0, 0, 1, 1, 2, 2, 3]


def test_cells_are_split_as_often_as_asked():
    mesh = strip(cells=8, rows=2)
    passes = np.zeros(len(mesh.cells), dtype=int)
    passes[3] = 2
    finer = split_cells(mesh, passes)
    centre = mesh.points[mesh.cells[3]].mean(axis=0)
    spot = np.argmin(np.linalg.norm(finer.points[finer.cells].mean(axis=1) - centre, axis=1))
    assert finer.areas[spot] <= mesh.areas[3] / 16 * (1 + 1e-9)
    assert finer.areas.sum() == pytest.approx(mesh.areas.sum())
    assert len(finer.cells) < 16 * len(mesh.cells) / 2


def test_steps_owe_right_after_the_jump():
    s = study()
    owed = step_doubt(s, Key("gauge", "g0"))
    assert owed.shape == (len(s.timing[0].steps),)
    assert (owed >= 0).all()
    assert owed.max() > 0
