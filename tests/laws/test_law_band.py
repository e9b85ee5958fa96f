"""The band covers the exact answer, on slabs drawn at random that were not used to tune it."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from fem.results.history import Key
from tests.support.cases import facts_of, gauges_at
from tests.support.grids import face, problem_on, strip
from tests.support.jobs import FEW
from tests.support.series import slab_film, slab_flux, slab_held


def covered(facts, places, exact):
    """Return for each gauge and reported instant whether the band holds the exact value, and band over error."""
    grid, inside, ratio = facts.figures.grid, [], []
    for i, x in enumerate(places):
        value, band = facts.figures.series(Key("gauge", f"g{i}"))
        for n in np.flatnonzero(grid.reported):
            error = abs(value[n] - exact(x, grid.t[n]))
            inside.append(error <= band[n])
            ratio.append(band[n] / max(error, 1e-12))
    return inside, ratio


def study(cells, edge, end, places, start=300.0, tolerance=0.05):
    mesh = strip(cells=cells)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", **edge)], start=start, end=end, report_every=end / 10
    )
    height = np.ptp(mesh.points[:, 1])
    return facts_of(mesh, problem, gauges_at(*((x, 0.5 * height) for x in places)), tolerance=tolerance)


CELLS = st.integers(4, 12)
ENDS = st.floats(0.05, 2.0)
PLACES = st.tuples(st.floats(0.0, 0.4), st.floats(0.5, 0.95))


@FEW
@given(cells=CELLS, end=ENDS, places=PLACES, held=st.floats(320.0, 1500.0))
def test_held_slabs(cells, end, places, held):
    facts = study(cells, {"held": held}, end, places)
    inside, ratio = covered(facts, places, lambda x, t: slab_held(x, t, half=1.0, alpha=1.0, start=300.0, held=held))
    assert all(inside)
    assert np.median(ratio) < 30.0  # a band that covers everything would be no merit


@FEW
@given(cells=CELLS, end=ENDS, places=PLACES, h=st.floats(0.1, 50.0), ambient=st.floats(320.0, 1500.0))
def test_slabs_with_a_film(cells, end, places, h, ambient):
    facts = study(cells, {"film": (h, ambient)}, end, places)
    inside, _ = covered(
        facts, places, lambda x, t: slab_film(x, t, half=1.0, k=1.0, alpha=1.0, h=h, start=300.0, ambient=ambient)
    )
    assert all(inside)


@FEW
@given(cells=CELLS, end=ENDS, places=PLACES, flux=st.floats(10.0, 2000.0))
def test_slabs_with_a_flux(cells, end, places, flux):
    facts = study(cells, {"flux": flux}, end, places)
    inside, _ = covered(
        facts, places, lambda x, t: slab_flux(x, t, thick=1.0, k=1.0, alpha=1.0, flux=flux, start=300.0)
    )
    assert all(inside)


def test_a_wrong_conductivity_falls_outside_the_band():
    """Teeth: 2 % off in the exact answer's conductivity is more than the band of a fine mesh."""
    facts = study(12, {"film": (5.0, 900.0)}, 0.3, (0.2, 0.8), tolerance=0.01)
    inside, _ = covered(
        facts, (0.2, 0.8), lambda x, t: slab_film(x, t, half=1.0, k=1.02, alpha=1.02, h=5.0, start=300.0, ambient=900.0)
    )
    assert not all(inside)
