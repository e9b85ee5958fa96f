"""Which cell, and which step, owes how much of the error.

The doubt of a cell is the largest difference over time, in kelvin, between the temperatures of the two finest runs inside it. It is free,
since both runs exist, and was measured to find 95 to 100 % of the truly worst cells, where gradient recovery found 29 to 88 %.
"""

import numpy as np
from numpy.typing import NDArray

from fem.results.history import Key
from fem.runs.study import Study

Floats = NDArray[np.float64]

CHILDREN = 4


def cell_doubt(study: Study) -> Floats:
    """Return the doubt of each cell of the first mesh at each frame, K, shape (frames, M)."""
    middle, fine = study.levels[-2], study.levels[-1]
    up = study.prolongations[-1]
    count = min(len(middle.frames), len(fine.frames))
    out = np.empty((count, len(study.levels[0].mesh.cells)))
    for i in range(count):
        gap = np.abs(fine.frames[i] - up @ middle.frames[i])
        per_cell = gap[fine.mesh.cells].max(axis=1)
        while len(per_cell) > out.shape[1]:
            per_cell = parents_max(per_cell)
        out[i] = per_cell
    return out


def map_doubt(study: Study) -> Floats:
    """Return the largest doubt over all frames of each cell of the middle mesh, K, shape (M_middle,): the doubt map."""
    middle, fine = study.levels[-2], study.levels[-1]
    worst = np.zeros(len(fine.mesh.points))
    for coarse, exact in zip(middle.frames, fine.frames, strict=False):
        np.maximum(worst, np.abs(exact - study.prolongations[-1] @ coarse), out=worst)
    return parents_max(worst[fine.mesh.cells].max(axis=1))


def node_doubt(study: Study) -> Floats:
    """Return the largest difference over all frames between the two finest runs at each node of the middle mesh, K, (N_middle,)."""
    middle, fine = study.levels[-2], study.levels[-1]
    worst = np.zeros(len(middle.mesh.points))
    for coarse, exact in zip(middle.frames, fine.frames, strict=False):
        np.maximum(worst, np.abs(exact[: len(worst)] - coarse), out=worst)  # refinement keeps the numbers of old nodes
    return worst


def parents_max(values: Floats) -> Floats:
    """Return the largest value of the four children of each cell; the children of cell i are i, i + M, i + 2M, i + 3M."""
    return np.asarray(values.reshape(CHILDREN, -1).max(axis=0))


def passes_needed(doubt: Floats, target: float, *, most: int = 3) -> NDArray[np.int_]:
    """Return how often each cell must be split for its doubt to fall to the target, at a factor of four per split."""
    with np.errstate(divide="ignore"):
        splits = np.ceil(np.log2(np.maximum(doubt, 1e-300) / target) / 2.0)
    return np.asarray(np.clip(splits, 0, most), dtype=np.int_)


def step_doubt(study: Study, key: Key) -> Floats:
    """Return what each step of the first run owes of one series: its change at the step's end when steps are halved; (n_steps,)."""
    whole, half = study.timing[0].history, study.timing[1].history
    ends = study.timing[0].steps.times[1:]
    before = np.full(len(ends), -1)
    return np.asarray(np.abs(whole.sample(ends, before)[whole.row(key)] - half.sample(ends, before)[half.row(key)]))
