"""The linear job that is timed: a block with a metal core, heated by a film whose ambient ramps up, one side held cold."""

from dataclasses import replace

import numpy as np

from fem.docket import Clock, Docket, Exposure, Film, Gauge, Region, Section, Start, Vertex, Wanted
from fem.earn.pose import Posed, pose
from fem.mesh.make import Mesh, make_mesh
from fem.mesh.refine import uniform
from fem.solve.stepping import Steps
from fem.stock import Stock

END = 7200.0  # s
COLD, HOT = 293.15, 593.15  # K
FILM = 25.0  # W/(m2 K)
SLAB = Stock(conductivity=1.5, density=2000.0, specific_heat=900.0)
CORE = Stock(conductivity=40.0, density=7800.0, specific_heat=480.0)


def _rectangle(name: str, stock: str, x0: float, y0: float, x1: float, y1: float) -> Region:
    corners = ((x0, y0, "bottom"), (x1, y0, "right"), (x1, y1, "top"), (x0, y1, "left"))
    return Region(name=name, stock=stock, outline=tuple(Vertex(x=x, y=y, edge=edge) for x, y, edge in corners))


def docket(band: float = 1.0) -> Docket:
    """Return the job; `band` is the wanted one at the gauges, K."""
    return Docket(
        title="Block with a metal core",
        section=Section(
            kind="planar",
            regions=(
                _rectangle("block", "slab", 0.0, 0.0, 0.5, 0.3),
                _rectangle("core", "core", 0.1, 0.1, 0.3, 0.2),
            ),
        ),
        stock={"slab": SLAB, "core": CORE},
        exposures=(
            Exposure(name="hot air", on=("block.top", "block.right"), film=Film(coefficient=FILM, ambient=ambient)),
            Exposure(name="cold plate", on=("block.bottom",), held=COLD),
        ),
        clock=Clock(end=END, report_every=600.0),
        start=Start(everywhere=COLD),
        gauges=(Gauge(name="in the core", x=0.2, y=0.15), Gauge(name="in the block", x=0.4, y=0.22)),
        wanted=Wanted(gauges=band),
    )


def ambient(t: float) -> float:
    """Return the air's temperature at t [s], K."""
    return COLD + (HOT - COLD) * t / END


def posed() -> Posed:
    return pose(docket())


def mesh_near(job: Posed, nodes: int) -> Mesh:
    """Return a mesh of about so many nodes; big ones by splitting, since meshing them anew costs more than solving on them."""
    splits = 0
    while nodes / 4**splits > 4000:
        splits += 1
    finer = 1.0
    for _ in range(6):
        mesh = make_mesh(job.plan, finer=finer)
        if abs(len(mesh.points) * 4**splits / nodes - 1.0) < 0.03:
            break
        finer *= float(np.sqrt(nodes / 4**splits / len(mesh.points)))
    for _ in range(splits):
        mesh = uniform(mesh)[0]
    return mesh


def equal_steps(count: int) -> Steps:
    return Steps(np.linspace(0.0, END, count + 1))


def shorter(job: Posed, end: float) -> Posed:
    """Return the job with the clock ended earlier."""
    return replace(job, problem=replace(job.problem, end=end))
