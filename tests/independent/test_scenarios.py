"""Two scenarios' sections by NGSolve, a general-purpose finite-element library: the gauges' histories agree within our band.

Each scenario is shortened by stated changes of its docket, made before either side reads it; the library's own error is taken
from its own refinement (cells and steps halved) as the whole difference of the two runs, and must be below our band.
"""

import re
import shutil
from collections.abc import Callable
from pathlib import Path

import ngsolve as ng
import numpy as np
import pytest
from scipy.ndimage import maximum_filter1d

from fem.docket.file import read_docket
from fem.results.history import Key
from fem.vouch import vouch
from tests.independent.finite_elements import ZERO, Run, mesh_of
from tests.independent.job import Job, read

SCENARIOS = Path(__file__).parents[2] / "scenarios"
Changes = list[tuple[str, str]]
NEARBY = 2  # reporting times

RAW_LOGS = (
    r", thin = [\d.]+",
    "",
)  # thinning is part of our reader: what is compared is the solving, on the logs as they are


def changed(folder: Path, name: str, changes: Changes) -> Path:
    """Return a copy of a scenario's docket, with its logs beside it, in which every change has been made."""
    for log in (SCENARIOS / name).glob("*.csv"):
        shutil.copy(log, folder)
    text = (SCENARIOS / name / f"{name}.docket.toml").read_text(encoding="utf-8")
    for old, new in changes:
        text, count = re.subn(old, new, text, flags=re.MULTILINE)
        assert count, f"the scenario has no {old!r} any more: change this test with it"
    path = folder / f"{name}.docket.toml"
    path.write_text(text, encoding="utf-8")
    return path


def ours(path: Path, job: Job) -> tuple[np.ndarray, np.ndarray]:
    """Return our gauges' temperatures, degC, and bands at the reporting times after the begin, (n_gauges, n_times) each."""
    record = vouch(read_docket(path))
    assert record.outcome == "finished"
    count = round((job.end - job.begin) / job.every)
    times = job.begin + job.every * np.arange(1, count + 1)
    at = [int(np.flatnonzero(np.isclose(record.figures.grid.t, t))[0]) for t in times]
    series = [record.figures.series(Key("gauge", name)) for name in job.gauges]
    return np.array([v[at] for v, _ in series]) - ZERO, np.array([b[at] for _, b in series])


def theirs(job: Job, size: Callable[[str], float], parts: int, order: int) -> tuple[np.ndarray, np.ndarray]:
    """Return the library's values, degC, and their error: the most that halving cells and steps still changes nearby in time.

    Nearby, two reporting times either way, since a difference of two runs crosses zero where neither is exact.
    """
    ng.ngsglobals.msg_level = 0
    coarse = Run(job, mesh_of(job, lambda name: 2.0 * size(name)), order=order).march(parts)
    fine = Run(job, mesh_of(job, size), order=order).march(2 * parts)
    return fine, maximum_filter1d(np.abs(fine - coarse), 2 * NEARBY + 1, axis=1)


def check(path: Path, sizes: dict[str, float], other: float, parts: int, skip: int, order: int = 2) -> None:
    job = read(path)
    value, band = ours(path, job)
    reference, error = theirs(job, lambda name: sizes.get(name, other), parts, order)
    said = slice(skip, None)
    for i, name in enumerate(job.gauges):
        apart, own, ours_i = np.abs(value - reference)[i, said], error[i, said], band[i, said]
        print(
            f"{name}: apart {apart.max():.4f}, own error {own.max():.4f}, band {ours_i.min():.4f} to {ours_i.max():.4f} K"
        )
        assert np.all(own < ours_i), f"{name}: the library's error {own.max():.3g} K is too large to say anything"
        assert np.all(apart <= ours_i + own), f"{name}: {apart.max():.3g} K apart"


@pytest.mark.slow
def test_cold_store_corner(tmp_path):
    """Linear: films, sun, daily air, held ground; the first 36 of 144 hours, hot day and night."""
    changes = [RAW_LOGS, (r"^end = 144", "end = 36"), (r"^during = .*", "")]
    sizes = {"skirting": 0.01, "floor insulation": 0.015, "plinth": 0.015, "head": 0.015}
    check(changed(tmp_path, "cold-store-corner", changes), sizes, 0.03, parts=2, skip=2)


@pytest.mark.slow
def test_kiln_car_deck(tmp_path):
    """Radiation, k(T), c(T): three quarters of an hour around the opening of the door, from a start that is made up.

    Cubic elements: the corners of steel in castable ask for them.
    """
    starts = {"deck": 700, "brick": 350, "bearer": 250, "beam": 250}
    changes = [RAW_LOGS, (r"^end = 1080", "begin = 715\nend = 760"), (r"^gauges = 3", "gauges = 5")]
    changes += [
        (rf'^name = "{name}"\nstock', f'name = "{name}"\nstart = {start}\nstock') for name, start in starts.items()
    ]
    sizes = {"beam": 0.005, "bearer": 0.008, "deck": 0.009}
    check(changed(tmp_path, "kiln-car-deck", changes), sizes, 0.02, parts=5, skip=4, order=3)
