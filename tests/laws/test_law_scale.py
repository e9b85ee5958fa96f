"""Units, sizes and sums: what a linear heat equation allows, and what any must keep."""

from dataclasses import replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from fem.docket.file import read_text
from fem.laws import as_law
from fem.results.history import Key
from fem.schedules.log_folder import LogFolder
from fem.solve.march import Outcome
from fem.solve.problem import Film
from fem.solve.run import run
from fem.vouch import vouch
from tests.support.cases import gauges_at
from tests.support.grids import face, problem_on
from tests.support.jobs import FEW, Job, bar, jobs, posed, solved, with_points

ROUNDING = 1e-9


@FEW
@given(job=jobs(curved=False))
def test_half_the_size_takes_a_quarter_of_the_time(job):
    """Lengths x 1/2, times x 1/4, film and flux x 2, sources x 4: the same temperatures, in the same places of the section."""
    mesh = bar()
    small = with_points(mesh, lambda z: 0.5 * z)
    first = posed(job, mesh.plan)

    def quicker(law):
        return law if "t" not in law.needs else replace(law, evaluate=lambda t: law(t=4 * t))

    def times(law, factor):
        return as_law(factor * law())

    faces = tuple(
        replace(
            f,
            held=None if f.held is None else quicker(f.held),
            fluxes=tuple(times(q, 2.0) for q in f.fluxes),
            films=tuple(Film(times(film.coefficient, 2.0), quicker(film.ambient)) for film in f.films),
        )
        for f in first.faces
    )
    second = replace(first, faces=faces, source=(None, as_law(4 * job.source)), end=first.end / 4)
    here, there = solved(mesh, first), solved(small, second)
    # Held rates of change are found by differences of the law: they move no temperature, and heats only by rounding.
    np.testing.assert_allclose(there.frames, here.frames, rtol=ROUNDING)
    np.testing.assert_allclose(there.face_heat, 0.25 * here.face_heat, rtol=1e-7, atol=1e-7 * here.exchanged)


@FEW
@given(one=jobs(curved=False), two=jobs(curved=False), a=st.floats(-2.0, 2.0))
def test_solutions_of_a_linear_problem_add_up(one, two, a):
    """T[u + a v] = T[u] + a T[v], where u, v are all that drives: start, ambient, held, flux, source."""
    mesh = bar()

    def fields(start, ambient, held, flux, source):
        faces = [
            face(mesh.plan, "part 1.right", film=(2.0, lambda t: ambient * np.cos(t))),
            face(mesh.plan, "part 1.top", flux=flux),
            face(mesh.plan, "part 0.left", held=held),
        ]
        problem = problem_on(
            mesh.plan, faces, k=(1.0, 3.0), rho_c=(2.0, 1.0), source=(None, source), start=start, end=0.4
        )
        return solved(mesh, problem).frames

    u, v = ((j.start, j.ambient, j.held, j.flux, j.source) for j in (one, two))
    both = fields(*(p + a * q for p, q in zip(u, v, strict=True)))
    np.testing.assert_allclose(both, fields(*u) + a * fields(*v), rtol=ROUNDING, atol=ROUNDING * 3000.0)


@FEW
@given(job=jobs())
def test_the_heat_ledger_closes(job):
    mesh = bar()
    result = solved(mesh, posed(job, mesh.plan))
    turned = np.abs(result.face_heat).sum() + np.abs(result.made).sum()
    assert abs(result.face_heat.sum() + result.made.sum() - result.stored) <= 1e-6 * turned


@FEW
@given(job=jobs(), tolerance=st.sampled_from([0.1, 30.0]))
def test_temperatures_stay_between_what_drives_them(job, tolerance):
    """Maximum principle: without heat made or flux, between the start and all that is held or faced, however coarse the steps."""
    job = replace(job, source=0.0, flux=0.0)
    mesh = bar()
    result = run(mesh, posed(job, mesh.plan), gauges_at(), tolerance=tolerance, first=0.1)
    assert result.outcome is Outcome.finished
    drives = [job.start, job.held, job.held + 4.0, 0.9 * job.ambient, 1.1 * job.ambient]
    slack = 1e-4 * tolerance  # Newton's remainder is 1e-6 of the tolerance per stage
    assert min(drives) - slack <= result.low.min()
    assert result.peak.max() <= max(drives) + slack


@FEW
@given(job=jobs(curved=False), sign=st.sampled_from([1.0, -1.0]))
def test_heat_in_never_cools_and_heat_out_never_warms(job, sign):
    """Comparison principle; long steps, so that damping and not resolution must do it."""
    mesh = bar()
    base, pushed = (solved(mesh, posed(replace(job, flux=flux), mesh.plan), count=5) for flux in (0.0, sign * 100.0))
    gain = sign * (pushed.frames - base.frames)
    assert gain.min() >= -ROUNDING * 2000.0
    assert gain.max() > 1.0


@FEW
@given(job=jobs(curved=False))
def test_what_is_hotter_at_the_start_stays_hotter(job):
    """Order is kept by a scheme of the lumped kind with damped steps, up to what Newton leaves."""
    mesh = bar()
    cool, warm = (solved(mesh, posed(replace(job, start=job.start + rise), mesh.plan), count=5) for rise in (0.0, 20.0))
    assert (warm.frames - cool.frames).min() >= -1e-9 * 1000.0


FILE = """
[docket]
format = 1
title = "bar"
length = "{length}"
time = "{time}"
temperature = "{temperature}"
[section]
kind = "planar"
[[region]]
name = "bar"
stock = "stuff"
outline = [[0, 0, "bottom"], [{x}, 0, "right"], [{x}, {y}, "top"], [0, {y}, "left"]]
[stock.stuff]
conductivity = [[{T0}, 1.0], [{T2}, 2.0]]
density = 2000
specific_heat = 900
[[exposure]]
name = "kiln"
on = ["bar.right"]
film = {{ coefficient = 40, ambient = {{ points = [[0, {T0}], [{t1}, {T2}], [{t2}, {T2}]] }} }}
radiant = {{ emissivity = 0.7, surroundings = {T1} }}
[clock]
end = {t2}
report_every = {t1}
[start]
everywhere = {T0}
[[gauge]]
name = "in"
at = [{gx}, {gy}]
[wanted]
gauges = "5 K"
"""


def written(length, time, temperature):
    """Return one and the same job in the words of different units."""
    per_metre = {"mm": 1e3, "cm": 1e2, "m": 1.0, "in": 1 / 0.0254}[length]
    per_second = {"s": 1.0, "min": 1 / 60, "h": 1 / 3600}[time]
    as_text = {"K": lambda T: T, "degC": lambda T: T - 273.15, "degF": lambda T: 1.8 * T - 459.67}[temperature]
    lengths = {"x": 0.0508, "y": 0.0127, "gx": 0.0254, "gy": 0.00635}
    values = {k: repr(v * per_metre) for k, v in lengths.items()}
    values |= {k: repr(v * per_second) for k, v in {"t1": 180.0, "t2": 540.0}.items()}
    values |= {k: repr(as_text(T)) for k, T in {"T0": 293.15, "T1": 500.0, "T2": 1200.0}.items()}
    return read_text(FILE.format(length=length, time=time, temperature=temperature, **values), logs=LogFolder())


def test_the_units_of_a_docket_move_no_number():
    base = vouch(written("m", "s", "K"))
    key = Key("gauge", "in")
    for words in (("mm", "min", "degC"), ("in", "h", "degF")):
        record = vouch(written(*words))
        for t in base.figures.grid.t[base.figures.grid.reported]:
            (v, b), (w, c) = base.figures.at(key, t), record.figures.at(key, t)
            assert abs(v - w) <= b + c  # rounding of lengths may move the mesh generator's nodes, so not closer
            assert max(b, c) <= 5.0


def test_jobs_are_drawn_with_every_kind_of_drive():
    """Teeth of the strategies: each drive of the standard job moves some temperature by more than rounding."""
    mesh = bar()
    base = solved(mesh, posed(Job(), mesh.plan)).frames
    for name, value in {
        "h": 4.0,
        "ambient": 500.0,
        "flux": 40.0,
        "held": 360.0,
        "source": 20.0,
        "start": 310.0,
        "curved": True,
    }.items():
        changed = solved(mesh, posed(replace(Job(), **{name: value}), mesh.plan)).frames
        assert np.abs(changed - base).max() > 1e-3, name
