"""Every check of a study, shown to fire on a planted fault and to be silent on the sound case."""

from dataclasses import replace

import numpy as np
import pytest

from fem.checks import (
    CHECKS,
    check_all,
    corners,
    extremes,
    first_transient,
    ledger,
    mesh_quality,
    order,
    outcome,
    pieces,
    stock_range,
)
from fem.checks.facts import Goal, RegionStock
from fem.mesh.make import make_mesh
from fem.results.history import Key
from fem.runs.study import Bench
from fem.section.build import build_plan
from fem.solve.conduction import Conduction
from fem.solve.march import March, Outcome
from fem.solve.run import run
from fem.vouch import vouch
from tests.support.cases import box, docket_of, facts_of, gauges_at, region, slab_docket, with_finest
from tests.support.grids import box_plan, face, grid_mesh, problem_on, square, strip
from tests.support.jobs import with_points
from tests.support.shapes import outline, rect


def bar_facts(cells=6, report=0.1, end=1.0, held=None, film=(2.0, 500.0), more=(), **how):
    """Return facts of a bar that is warmed at its right end from 300 K."""
    mesh = strip(cells=cells)
    drive = {"held": held} if held is not None else {"film": film}
    faces = [face(mesh.plan, "part 0.right", **drive), *(face(mesh.plan, edge, **given) for edge, given in more)]
    problem = problem_on(mesh.plan, faces, start=300.0, end=end, report_every=report)
    return facts_of(mesh, problem, gauges_at((0.5, 0.0)), **how)


@pytest.fixture(scope="module")
def sound():
    return bar_facts()


def test_no_check_says_a_word_on_a_sound_study(sound):
    assert sound.study.finished
    assert check_all(sound) == ()


def test_findings_that_block_come_first(sound):
    stocks = (RegionStock("part 0", "clay", 0.0, 310.0),)
    early = replace(
        sound,
        stocks=stocks,
        figures=replace(sound.figures, grid=replace(sound.figures.grid, origin=sound.figures.grid.t)),
    )
    found = check_all(early)
    assert [f.blocks for f in found] == sorted((f.blocks for f in found), reverse=True)
    assert {f.blocks for f in found} == {True, False}


def test_every_check_of_the_package_is_in_the_list_that_is_run():
    assert {check.__module__ for check in CHECKS} == {
        m.__name__
        for m in (corners, extremes, first_transient, ledger, mesh_quality, order, outcome, pieces, stock_range)
    }


# --- ledger -------------------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("curved", [False, True])
def test_ledger_fires_when_a_march_loses_heat(monkeypatch, curved):
    """A hundred-thousandth of every step's warming vanishes."""
    keep = March._advance

    def lose(self, step, impulse):
        return keep(self, replace(step, T1=step.T1 - 1e-5 * (step.T1 - step.T0)), impulse)

    mesh = strip(cells=4)
    k = (lambda T: 1.0 + 0.001 * T) if curved else 1.0
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, 500.0))], k=k, start=300.0, end=1.0, report_every=0.1
    )
    assert ledger.check(facts_of(mesh, problem, gauges_at())) == []
    monkeypatch.setattr(March, "_advance", lose)
    (finding,) = ledger.check(facts_of(mesh, problem, gauges_at()))
    assert finding.blocks
    assert "unexplained" in finding.message


def test_ledger_fires_when_heat_through_a_face_is_not_counted(sound):
    assert ledger.check(sound) == []
    assert ledger.check(with_finest(sound, face_heat=sound.study.finest.face_heat * (1 + 2e-6)))


def test_ledger_fires_when_held_nodes_take_heat_that_no_face_shows(monkeypatch):
    sound = bar_facts(held=350.0)
    assert ledger.check(sound) == []
    split = Conduction.split_reaction
    monkeypatch.setattr(Conduction, "split_reaction", lambda self, reaction: 0.999 * split(self, reaction))
    assert ledger.check(bar_facts(held=350.0))


def test_ledger_does_not_cry_over_rounding_where_nothing_happens():
    assert ledger.check(bar_facts(film=(2.0, 300.0))) == []


# --- extremes -----------------------------------------------------------------------------------------------------------------------


def sheared(mesh, by):
    """Return the mesh leaning over: its cells become obtuse."""
    return with_points(mesh, lambda z: z + by * z.imag)


def test_extremes_and_mesh_quality_fire_on_obtuse_cells():
    """Obtuse cells couple nodes with the wrong sign; a quench then overshoots, which no refinement of the time steps mends."""
    good = square(6)
    plan = build_plan(
        [outline("part 0", [(0, 0), (1, 0), (4, 1), (3, 1)], dict(enumerate(("bottom", "right", "top", "left"))))]
    )
    leaning = replace(sheared(good, 3.0), plan=plan)
    for mesh, fires in ((good, False), (leaning, True)):
        problem = problem_on(
            mesh.plan, [face(mesh.plan, "part 0.bottom", held=400.0)], start=300.0, end=0.01, report_every=0.01
        )
        facts = facts_of(mesh, problem, gauges_at())
        assert bool(extremes.check(facts)) == fires
        assert any("wrong sign" in f.message for f in mesh_quality.check(facts)) == fires
    assert all(f.blocks for f in extremes.check(facts))
    assert "that the data allow" in extremes.check(facts)[0].message


def test_extremes_fires_above_and_below(sound):
    run = sound.study.finest
    hot, cold = run.peak.copy(), run.low.copy()
    hot[3], cold[4] = 501.0, 299.0
    found = extremes.check(with_finest(sound, peak=hot, low=cold))
    assert len(found) == 2
    assert (found[0].x, found[0].y) == tuple(run.mesh.points[3])
    assert "above the highest" in found[0].message
    assert "below the lowest" in found[1].message


@pytest.mark.parametrize(
    ("more", "high", "low"),
    [
        ({"flux": 10.0}, False, True),
        ({"flux": -10.0}, True, False),
        ({"flux": lambda t: 10 * np.sin(9 * t)}, False, False),
    ],
)
def test_a_flux_lifts_only_the_bound_that_it_can_reach(more, high, low):
    facts = bar_facts(more=[("part 0.left", more)])
    run = facts.study.finest
    said = " ".join(f.message for f in extremes.check(with_finest(facts, peak=run.peak + 900.0, low=run.low - 250.0)))
    assert ("above the highest" in said) == high
    assert ("below the lowest" in said) == low


@pytest.mark.parametrize(("source", "high", "low"), [(50.0, False, True), (-50.0, True, False)])
def test_a_source_lifts_only_the_bound_that_it_can_reach(source, high, low):
    mesh = strip(cells=4)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, 500.0))], source=source, start=300.0, end=1.0
    )
    facts = facts_of(mesh, problem, gauges_at())
    run = facts.study.finest
    said = " ".join(f.message for f in extremes.check(with_finest(facts, peak=run.peak + 900.0, low=run.low - 250.0)))
    assert ("above the highest" in said) == high
    assert ("below the lowest" in said) == low


# --- order --------------------------------------------------------------------------------------------------------------------------


def test_order_fires_when_the_finest_run_solves_something_else():
    """Two per cent more conductivity on the finest mesh only: differences grow instead of falling by four."""
    mesh = strip(cells=6)
    problem = problem_on(
        mesh.plan, [face(mesh.plan, "part 0.right", film=(2.0, 500.0))], start=300.0, end=1.0, report_every=0.1
    )
    other = replace(problem, conductivity=problem_on(mesh.plan, k=1.02).conductivity)
    gauges = gauges_at((0.5, 0.0))
    study = Bench(problem, gauges, tolerance=0.01).first(mesh)
    last = run(
        study.finest.mesh,
        other,
        gauges,
        tolerance=0.01,
        steps=study.levels[0].steps,
        frame_times=study.finest.frame_times,
    )
    wrong = replace(study, levels=(*study.levels[:-1], last))
    assert order.check(facts_of(mesh, problem, gauges, study=study, wanted=0.01)) == []
    (finding,) = order.check(facts_of(mesh, problem, gauges, study=wrong, wanted=0.01))
    assert finding.blocks
    assert "rests on no theory" in finding.message
    # Where the band is far below the wanted one, an odd order is not worth a word.
    assert order.check(facts_of(mesh, problem, gauges, study=wrong, wanted=1e4)) == []


@pytest.mark.parametrize(("seen", "count", "blocks"), [(1.3, 0, False), (1.0, 1, False), (0.4, 1, True)])
def test_order_tells_slow_from_hopeless(sound, seen, count, blocks):
    table = sound.figures
    planted = replace(table, order=np.full(table.order.shape, seen), space=np.full(table.space.shape, 5.0))
    found = order.check(replace(sound, figures=planted))
    assert len(found) == count
    assert all(f.blocks is blocks for f in found)


# --- first transient ----------------------------------------------------------------------------------------------------------------


def test_first_transient_fires_while_heat_has_not_crossed_a_cell():
    """h = 1/24 on the finest mesh and alpha = 1: from 1/576 = 0.0017 s on (longest edge of a cell cut in two: twice that)."""
    early = bar_facts(report=0.0005, end=0.01)
    (finding,) = first_transient.check(early)
    assert not finding.blocks
    assert "unresolved first transient" in finding.message
    needed = first_transient.resolved_after(early)[0]
    assert needed == pytest.approx(2 / 576, rel=1e-9)
    assert f"{int(needed / 0.0005)} reported values" in finding.message
    assert first_transient.check(bar_facts(report=0.01, end=0.1)) == []


# --- stock range --------------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("low", "high", "count"), [(299.0, 501.0, 0), (299.0, 320.0, 1), (301.0, 501.0, 1), (301.0, 320.0, 2)]
)
def test_stock_range_fires_outside_of_it_only(sound, low, high, count):
    found = stock_range.check(replace(sound, stocks=(RegionStock("part 0", "clay", low, high),)))
    assert len(found) == count
    assert all(f.blocks and '"clay"' in f.message for f in found)


def test_stock_range_names_the_highest_excursion_and_its_place(sound):
    run = sound.study.finest
    (finding,) = stock_range.check(replace(sound, stocks=(RegionStock("part 0", "clay", 0.0, 320.0),)))
    assert finding.x == pytest.approx(1.0)  # the warmed end
    assert f"{run.peak.max() - 320.0:.3g} K outside" in finding.message


def test_stock_range_says_where_it_can_not_look(sound):
    (finding,) = stock_range.check(replace(sound, stocks=(RegionStock("part 0", "clay", 0.0, np.inf),)))
    assert not finding.blocks
    assert '"clay"' in finding.message


# --- corners ------------------------------------------------------------------------------------------------------------------------


def ell_facts(points, wanted):
    plan = build_plan([outline("ell", points)])
    mesh = make_mesh(plan)
    labels = [label for c in plan.curves for label in sorted(c.labels)]
    problem = problem_on(
        plan, [face(plan, tuple(labels), film=(50.0, 400.0))], start=300.0, end=0.05, report_every=0.01
    )
    return facts_of(mesh, problem, gauges_at((-0.5, 0.5)), wanted=wanted)


ELL = [(0, 0), (1, 0), (1, 1), (-1, 1), (-1, -1), (0, -1)]


def test_corners_fires_at_a_reentrant_corner_that_owes_more_than_is_wanted():
    (finding,) = corners.check(ell_facts(ELL, wanted=1e-3))
    assert (finding.x, finding.y) == pytest.approx((0.0, 0.0))
    assert "270 degrees" in finding.message
    assert not finding.blocks
    assert corners.check(ell_facts(ELL, wanted=1e3)) == []
    assert corners.check(ell_facts([(-1, -1), (1, -1), (1, 1), (-1, 1)], wanted=1e-3)) == []


def joined(left, right, kinds=("gauge",)):
    """Return facts of a square whose top is held in two halves."""
    plan = box_plan((0.0, 0.5, 1.0), 1.0)
    line = np.linspace(0.0, 1.0, 7)
    mesh = grid_mesh(plan, line, line, lambda x, _: (x > 0.5).astype(int))
    faces = [face(plan, "part 0.top", name="one", held=left), face(plan, "part 1.top", name="two", held=right)]
    problem = problem_on(plan, faces, start=300.0, end=0.1, report_every=0.02)
    goals = [Goal(Key(kind, "g0" if kind == "gauge" else "one"), 1.0, "wanted band") for kind in kinds]
    return facts_of(mesh, problem, gauges_at((0.5, 0.3)), goals=goals)


def test_corners_fires_where_different_held_temperatures_meet():
    (finding,) = corners.check(joined(400.0, 350.0))
    assert (finding.x, finding.y) == pytest.approx((0.5, 1.0))
    assert "50 K" in finding.message
    assert not finding.blocks
    (asked,) = corners.check(joined(400.0, 350.0, ("gauge", "heat")))
    assert asked.blocks
    assert corners.check(joined(400.0, 400.0, ("gauge", "heat"))) == []


# --- mesh quality -------------------------------------------------------------------------------------------------------------------


def test_mesh_quality_fires_on_flat_cells():
    thin = build_plan([rect("part 0", 0, 0, 1, 0.1)])
    for y, fires in ((np.linspace(0, 0.1, 3), False), (np.array([0.0, 0.01, 0.1]), True)):
        mesh = grid_mesh(thin, np.linspace(0, 1, 9), y)
        problem = problem_on(
            thin, [face(thin, "part 0.right", film=(2.0, 500.0))], start=300.0, end=0.1, report_every=0.1
        )
        found = mesh_quality.check(facts_of(mesh, problem, gauges_at()))
        assert any("flat cells" in f.message for f in found) == fires
    angle = np.degrees(np.arctan(0.01 / 0.125))  # of the flattest cell
    assert any(f"{angle:.1f} degrees" in f.message for f in found)


# --- outcome ------------------------------------------------------------------------------------------------------------------------


def test_outcome_fires_on_any_run_that_did_not_finish(sound):
    assert outcome.check(sound) == []
    broken = replace(sound.study.timing[1], outcome=Outcome.newton_failed)
    study = replace(sound.study, timing=(sound.study.timing[0], broken, sound.study.timing[2]))
    (finding,) = outcome.check(replace(sound, study=study))
    assert finding.blocks
    assert "could not be solved" in finding.message
    (finding,) = outcome.check(with_finest(sound, outcome=Outcome.not_finite))
    assert "infinite or undefined" in finding.message


@pytest.mark.parametrize("end", [None, 600.0])
def test_a_job_in_which_nothing_happens_is_vouched(end):
    """Rounding is no heat that vanished, be it all that there is."""
    alike = {
        "hot": {"on": ("slab.right",), "held": 293.15},
        "air": {"on": ("slab.left",), "film": {"coefficient": 8.0, "ambient": 293.15}},
    }
    record = vouch(slab_docket(end=end, exposures=alike))
    assert record.standing == "vouched"
    assert abs(record.ledger.unexplained) < 1e-6


# --- pieces -------------------------------------------------------------------------------------------------------------------------


def test_a_section_in_two_pieces_is_told_and_one_in_one_piece_is_not():
    def found(gap):
        docket = docket_of(
            [region("steel", box(0, 0, 1, 1)), region("wool", box(1 + gap, 0, 2, 1))],
            {"hot": {"on": ("steel.left",), "held": 400.0}, "cold": {"on": ("wool.right",), "held": 300.0}},
            end=1.0, gauges={"g": (0.5, 0.5)},
        )  # fmt: skip
        return [f for f in vouch(docket).findings if f.check == "pieces"]

    assert found(0.0) == []
    (finding,) = found(0.1)
    assert '"steel" | "wool"' in finding.message
    assert not finding.blocks
