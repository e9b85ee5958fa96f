"""Small sections with meshes made by hand, so that a test knows every node; no mesh generator runs."""

import itertools

import numpy as np

from fem.laws import as_law
from fem.mesh.data import Mesh
from fem.section.build import build_plan
from fem.solve.problem import Face, Film, Problem, Radiant
from tests.support.shapes import rect


def box_plan(xs, height, kind="planar", y0=0.0):
    """Return the plan of rectangles side by side, `part 0`, `part 1`, ... between the given x; edges bottom, right, top, left."""
    parts = [rect(f"part {i}", a, y0, b, y0 + height) for i, (a, b) in enumerate(itertools.pairwise(xs))]
    return build_plan(parts, kind=kind)


def grid_mesh(plan, x, y, keep=None, *, alternate=False):
    """Return the grid of nodes x, y [m] with every rectangle cut in two, `keep(cx, cy)` the regions (-1: none) of the cells.

    With cuts of one direction the equations are those of the five-point formula, whose error is known; with alternate ones the nodes'
    volumes alternate too. All curves of the plan must run along grid lines.
    """
    nx, ny = len(x), len(y)
    points = np.array([(a, b) for b in y for a in x])
    i, j = (a.ravel() for a in np.meshgrid(np.arange(nx - 1), np.arange(ny - 1)))
    sw = j * nx + i
    se, nw, ne = sw + 1, sw + nx, sw + nx + 1
    even = ((i + j) % 2 == 0)[:, None] | (not alternate)
    first = np.where(even, np.column_stack((sw, se, ne)), np.column_stack((sw, se, nw)))
    second = np.where(even, np.column_stack((sw, ne, nw)), np.column_stack((se, ne, nw)))
    cells = np.concatenate((first, second))
    centre = points[cells].mean(axis=1)
    region = np.zeros(len(cells), dtype=int) if keep is None else np.asarray(keep(centre[:, 0], centre[:, 1]))
    cells, region = cells[region >= 0], region[region >= 0]
    used, compact = np.unique(cells, return_inverse=True)
    mesh_points, cells = points[used], compact.reshape(-1, 3)
    facets, curve = _facets(plan, mesh_points, cells)
    return Mesh(mesh_points, cells, region, facets, curve, plan)


def _facets(plan, points, cells):
    sides = np.unique(np.sort(np.concatenate([cells[:, [0, 1]], cells[:, [1, 2]], cells[:, [2, 0]]]), axis=1), axis=0)
    facets, curves = [], []
    for index, c in enumerate(plan.curves):
        start, along = np.array(c.start), np.array(c.end) - np.array(c.start)
        relative = points - start
        s = relative @ along / (along @ along)
        off = np.abs(relative[:, 0] * along[1] - relative[:, 1] * along[0]) / np.hypot(*along)
        on = (off < 1e-9 * c.length) & (s > -1e-9) & (s < 1 + 1e-9)
        mine = sides[on[sides].all(axis=1)]
        backward = s[mine[:, 0]] > s[mine[:, 1]]
        mine[backward] = mine[backward, ::-1]
        facets.append(mine)
        curves.append(np.full(len(mine), index))
    return np.concatenate(facets), np.concatenate(curves)


def strip(xs=(0.0, 1.0), cells=8, kind="planar", rows=1, y0=0.0, height=None):
    """Return a bar of parts side by side, `cells` columns in each part; heat runs along x only, if top and bottom are insulated."""
    x = np.unique(np.concatenate([np.linspace(a, b, cells + 1) for a, b in itertools.pairwise(xs)]))
    height = float(np.min(np.diff(x))) * rows if height is None else height
    plan = box_plan(xs, height, kind, y0)
    return grid_mesh(plan, x, np.linspace(y0, y0 + height, rows + 1), lambda cx, _: np.searchsorted(xs, cx) - 1)


def square(cells=8, size=1.0, kind="planar", alternate=False):
    """Return the square [0, size]^2 with the same number of cells each way."""
    line = np.linspace(0.0, size, cells + 1)
    return grid_mesh(box_plan((0.0, size), size, kind), line, line, alternate=alternate)


def curves_of(plan, label):
    """Return the outside curves on an edge."""
    found = tuple(i for i, c in enumerate(plan.curves) if label in c.labels and min(c.left, c.right) < 0)
    assert found, f"{label} is on no outside curve of {[sorted(c.labels) for c in plan.curves]}"
    return found


def face(plan, label, *, name=None, held=None, flux=None, film=None, radiant=None):
    """Return a face on one edge, or several; values as numbers or callables, film and radiant as pairs."""
    labels = (label,) if isinstance(label, str) else label
    return Face(
        name=name or " ".join(labels),
        edge=labels[0],
        curves=tuple(sorted({i for one in labels for i in curves_of(plan, one)})),
        held=None if held is None else as_law(held),
        fluxes=() if flux is None else (as_law(flux),),
        films=() if film is None else (Film(as_law(film[0]), as_law(film[1])),),
        radiants=() if radiant is None else (Radiant(as_law(radiant[0]), as_law(radiant[1])),),
    )


def problem_on(
    plan, faces=(), *, k=1.0, rho_c=1.0, source=None, start=0.0, begin=0.0, end=1.0, report_every=0.0, instants=()
):
    """Return a problem; each of k, rho_c, source, start is one value for all regions or a tuple of one per region."""
    count = len(plan.region_names)

    def each(value):
        values = value if isinstance(value, tuple) else (value,) * count
        return tuple(None if v is None else as_law(v) for v in values)

    return Problem(
        revolution=plan.kind == "revolution",
        conductivity=each(k),
        heat_capacity=each(rho_c),
        source=each(source),
        start=each(start),
        faces=tuple(faces),
        begin=begin,
        end=end,
        report_every=report_every,
        instants=tuple(instants),
    )
