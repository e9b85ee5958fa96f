"""Whole dockets of small sections, and judged studies of problems that no docket poses."""

from dataclasses import replace

import numpy as np

from fem.checks.facts import Facts, Goal, Namer, RegionStock
from fem.docket import Clock, Docket, Exposure, Gauge, Region, Section, Start, Wanted
from fem.results.history import Key
from fem.runs.study import Bench
from fem.runs.tables import figures
from fem.solve.run import Gauges
from fem.stock import Stock

BRICK = {"conductivity": 1.0, "density": 2000.0, "specific_heat": 900.0}


def box(x0, y0, x1, y1):
    """Return a rectangle's outline with edges bottom, right, top, left."""
    return [[x0, y0, "bottom"], [x1, y0, "right"], [x1, y1, "top"], [x0, y1, "left"]]


def region(name, outline, stock="stuff", **more):
    """Return a region of a docket."""
    return Region(name=name, stock=stock, outline=outline, **more)


def docket_of(regions, exposures, *, kind="planar", stock=None, end=None, report=None, start=293.15, gauges=(), **more):
    """Return a docket; `gauges` maps names to places, `exposures` names to keywords of an exposure, no `end` means steady."""
    stock = {"stuff": BRICK} if stock is None else stock
    clock = None if end is None else Clock(end=end, report_every=report or end / 10, instants=more.pop("instants", ()))
    more.setdefault("wanted", Wanted(gauges=1.0))
    return Docket(
        title="test",
        section=Section(kind=kind, regions=tuple(regions)),
        stock={name: Stock(**values) for name, values in stock.items()},
        exposures=tuple(Exposure(name=name, **given) for name, given in exposures.items()),
        clock=clock,
        start=Start(everywhere=start),
        gauges=tuple(Gauge(name=name, x=x, y=y) for name, (x, y) in dict(gauges).items()),
        **more,
    )


def slab_docket(*, thick=0.04, high=0.01, end=600.0, gauges=None, exposures=None, **more):
    """Return a bar of brick, insulated but for its right end, which is held hot unless other exposures are given."""
    hot = {"hot": {"on": ("slab.right",), "held": 373.15}}
    places = {"back": (0.0, 0.5 * high)} if gauges is None else gauges
    return docket_of([region("slab", box(0, 0, thick, high))], exposures or hot, end=end, gauges=places, **more)


def gauges_at(*points):
    """Return gauges g0, g1, ... at points."""
    return Gauges(tuple(f"g{i}" for i in range(len(points))), np.array(points, dtype=float).reshape(-1, 2))


def facts_of(mesh, problem, gauges, *, wanted=1.0, tolerance=0.01, stocks=None, study=None, goals=None):
    """Return a whole study of a problem with all that checks look at."""
    study = Bench(problem, gauges, tolerance=tolerance).first(mesh) if study is None else study
    table = figures(study, problem)
    if goals is None:
        goals = tuple(Goal(Key("gauge", name), wanted, "wanted band") for name in gauges.names)
    if stocks is None:
        stocks = tuple(RegionStock(name, "stuff", 200.0, 3000.0) for name in mesh.plan.region_names)
    return Facts(study, problem, table, gauges, tuple(goals), stocks, Namer())


def with_finest(facts, **changes):
    """Return the facts with some fields of the finest run replaced."""
    levels = (*facts.study.levels[:-1], replace(facts.study.finest, **changes))
    return replace(facts, study=replace(facts.study, levels=levels))
