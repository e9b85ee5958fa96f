"""Pose the problem: docket -> plan, laws on regions and faces, gauges. What section and docket must agree on is checked here."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.checks.facts import Namer, RegionStock
from fem.docket import Docket, Exposure, Region, Stretch
from fem.earn.limits import rate_span
from fem.errors import DocketError, Problem
from fem.laws import Law, constant
from fem.quantities.units import to_si
from fem.schedules.models import law_of
from fem.section.build import Plan, plan_of, stretch_label
from fem.section.pieces import pieces
from fem.section.where import regions_at
from fem.solve.problem import Face, Film, Radiant
from fem.solve.problem import Problem as HeatProblem
from fem.solve.run import Gauges

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Posed:
    """A docket, ready to be solved.

    Attributes
    ----------
    docket : Docket
    plan : Plan
    problem : Problem
    gauges : Gauges
    stocks : tuple of RegionStock
        In the plan's region order.
    names : Namer
    narrowest : float
        The narrowest band asked for at any temperature, K.
    """

    docket: Docket
    plan: Plan
    problem: HeatProblem
    gauges: Gauges
    stocks: tuple[RegionStock, ...]
    names: Namer
    narrowest: float


def pose(docket: Docket) -> Posed:
    """Return the problem that a docket poses.

    Raises
    ------
    DocketError
        With every exposure that has no outside to act on, every edge with two held temperatures, every part without a level of
        temperature in a steady job, every gauge outside the section.
    SectionError
        If the outlines have no meaning.
    """
    plan = plan_of(docket)
    regions = [_region(docket, name) for name in plan.region_names]
    faces, problems = _faces(docket, plan)
    problems += _double_held(plan, faces) + _floating(docket, plan, faces) + _lost_gauges(docket, plan, namer(docket))
    if problems:
        raise DocketError(problems)
    begin, end = (None, None) if docket.clock is None else (docket.clock.begin, docket.clock.end)
    span = (begin or 0.0, end or 0.0)
    stocks = [docket.stock_of(region) for region in regions]
    problem = HeatProblem(
        revolution=docket.section.kind == "revolution",
        conductivity=tuple(stock.k_law() for stock in stocks),
        heat_capacity=tuple(stock.heat_capacity_law() for stock in stocks),
        source=tuple(None if region.source is None else law_of(region.source, *span) for region in regions),
        start=tuple(_start(docket, region) for region in regions),
        faces=tuple(faces),
        begin=begin,
        end=end,
        report_every=0.0 if docket.clock is None else docket.clock.report_every,
        instants=() if docket.clock is None else _instants(docket),
    )
    gauges = Gauges(tuple(g.name for g in docket.gauges), np.array([[g.x, g.y] for g in docket.gauges]).reshape(-1, 2))
    ranges = tuple(RegionStock(r.name, r.stock or "", *s.valid_range) for r, s in zip(regions, stocks, strict=True))
    bands = [docket.wanted.gauges, docket.wanted.regions, docket.wanted.means, *(gauge.band for gauge in docket.gauges)]
    narrowest = min(float(band) for band in bands if band is not None)
    return Posed(docket, plan, problem, gauges, ranges, namer(docket), narrowest)


def namer(docket: Docket) -> Namer:
    """Return what writes numbers in the docket's units."""
    units = docket.units
    return Namer(
        to_si(1.0, units.length, "length"), units.length, to_si(1.0, units.time, "time"), units.time, units.temperature
    )


def _region(docket: Docket, name: str) -> Region:
    return next(region for region in docket.section.regions if region.name == name)


def _start(docket: Docket, region: Region) -> Law:
    value = docket.start_of(region)
    return constant(293.15) if value is None else law_of(value)  # None: a steady job, whose start moves no number


def _instants(docket: Docket) -> tuple[float, ...]:
    """Return the clock's instants, and the ends of every span in which a limit is in force, so that histories have a value there."""
    assert docket.clock is not None  # noqa: S101 - transient only
    clock = docket.clock
    wanted = set(clock.instants)
    for limit in docket.limits:
        wanted |= set(limit.during or ())
        wanted |= {clock.begin + limit.within} if limit.within is not None else set()
        wanted |= {clock.begin + rate_span(docket, limit)} if limit.rate is not None else set()
    return tuple(sorted(t for t in wanted if clock.begin < t < clock.end))


# --- exposures ----------------------------------------------------------------------------------------------------------------------


def _faces(docket: Docket, plan: Plan) -> tuple[list[Face], list[Problem]]:
    faces, problems = [], []
    for exposure in docket.exposures:
        taken: set[int] = set()
        for ref in exposure.on:
            label = stretch_label(ref) if isinstance(ref, Stretch) else ref
            curves = _curves(plan, label)
            outside = [i for i in curves if min(plan.curves[i].left, plan.curves[i].right) < 0]
            if not outside:
                problems.append(_no_outside(exposure, label, found=bool(curves)))
            mine = tuple(i for i in outside if i not in taken)  # "deck.top" and "deck.*" in one exposure: once
            taken |= set(mine)
            if mine:
                faces.append(_face(docket, exposure, label, mine))
    return faces, problems


def _curves(plan: Plan, label: str) -> list[int]:
    region, _, edge = label.partition(".")
    if edge == "*":
        return [i for i, curve in enumerate(plan.curves) if any(name.startswith(region + ".") for name in curve.labels)]
    return [i for i, curve in enumerate(plan.curves) if label in curve.labels]


def _face(docket: Docket, exposure: Exposure, label: str, curves: tuple[int, ...]) -> Face:
    span = (0.0, 0.0) if docket.clock is None else (docket.clock.begin, docket.clock.end)
    film, radiant = exposure.film, exposure.radiant
    return Face(
        name=exposure.name,
        edge=label,
        curves=curves,
        held=None if exposure.held is None else law_of(exposure.held, *span),
        fluxes=() if exposure.flux is None else (law_of(exposure.flux, *span),),
        films=() if film is None else (Film(law_of(film.coefficient, *span), law_of(film.ambient, *span)),),
        radiants=()
        if radiant is None
        else (Radiant(law_of(radiant.emissivity, *span), law_of(radiant.surroundings, *span)),),
    )


def _no_outside(exposure: Exposure, label: str, *, found: bool) -> Problem:
    why = (
        "lies between two regions all along"
        if found
        else "lies on no outside of the section (covered, or inside a void)"
    )
    return Problem(
        f'exposure "{exposure.name}", on',
        label,
        f"an edge with some part on the outside of the section or on a void; this one {why}",
        "name another edge, or drop it: heat passes between touching regions by itself",
    )


def _double_held(plan: Plan, faces: list[Face]) -> list[Problem]:
    """Refuse a held temperature on an edge that faces anything else: it alone decides what happens there."""
    problems = []
    for i, one in enumerate(faces):
        for other in faces[i + 1 :]:
            both = set(one.curves) & set(other.curves)
            if both and (one.held is not None or other.held is not None):
                where = ", ".join(sorted(plan.curves[min(both)].labels))
                problems.append(
                    Problem(
                        f'exposures "{one.name}" and "{other.name}"',
                        f"both on {where}",
                        "a held temperature alone on its edge",
                        "drop one of the two there",
                    )
                )
    return problems


def _floating(docket: Docket, plan: Plan, faces: list[Face]) -> list[Problem]:
    """Refuse a steady job in which nothing fixes the temperature of some part."""
    if docket.clock is not None:
        return []
    anchored = {i for face in faces if _fixes(face) for i in face.curves}
    fixed = {plan.region_names[r] for i in anchored for r in (plan.curves[i].left, plan.curves[i].right) if r >= 0}
    afloat = [name for piece in pieces(plan) if not fixed & set(piece) for name in piece]
    return [
        Problem(
            f'region "{name}"',
            "no held temperature, film or radiant surroundings on it or on what it touches",
            "at least one in every part of a steady job",
            "add an exposure, or give the job a clock",
        )
        for name in afloat
    ]


def _fixes(face: Face) -> bool:
    """Return whether a face pulls the temperature to a level: held, or by a film or surroundings that are not nought for good."""
    laws = [film.coefficient for film in face.films] + [radiant.emissivity for radiant in face.radiants]
    return face.held is not None or any(not law.constant or float(law()) > 0.0 for law in laws)


# --- gauges -------------------------------------------------------------------------------------------------------------------------


def _lost_gauges(docket: Docket, plan: Plan, names: Namer) -> list[Problem]:
    """Refuse gauges outside the section, or not in the region that they name."""
    problems = []
    for gauge in docket.gauges:
        regions, _ = regions_at(plan, gauge.x, gauge.y)
        place = names.place(gauge.x, gauge.y)
        if not regions:
            problems.append(
                Problem(f'gauge "{gauge.name}", at', place, "a point of the section", "move it onto a region")
            )
        elif gauge.region is not None and gauge.region not in regions:
            allowed = " or ".join(f'"{name}"' for name in regions)
            problems.append(
                Problem(
                    f'gauge "{gauge.name}", region',
                    f'"{gauge.region}" at {place}',
                    f"{allowed}, which lies there",
                    "move the gauge or drop region",
                )
            )
    return problems
