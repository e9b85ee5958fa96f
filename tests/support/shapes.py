"""Outlines that the tests of the geometry share, and what is known about them."""

import math

import numpy as np

from fem.section.build import Outline, OutlineEdge

Point = tuple[float, float]


def outline(name, points, names=None, vias=None, solid=True):
    """Return an outline; `names` and `vias` are by position from 0."""
    names, vias = names or {}, vias or {}
    edges = tuple(OutlineEdge(names.get(i), vias.get(i)) for i in range(len(points)))
    return Outline(name, solid, tuple((float(x), float(y)) for x, y in points), edges)


def rect(name, x0, y0, x1, y1, solid=True):
    """Return a rectangle with edges bottom, right, top, left."""
    names = dict(enumerate(("bottom", "right", "top", "left")))
    return outline(name, [(x0, y0), (x1, y0), (x1, y1), (x0, y1)], names, solid=solid)


def disc(name, x, y, r, turned=0.0, solid=True):
    """Return a circle of two arcs, each named rim."""

    def p(angle):
        return x + r * math.cos(angle + turned), y + r * math.sin(angle + turned)

    vias = {0: p(math.pi / 2), 1: p(3 * math.pi / 2)}
    return outline(name, [p(0), p(math.pi)], {0: "rim", 1: "rim"}, vias, solid)


def ring_sector(name, r0, r1, angle0, angle1):
    """Return an annular sector about the origin with edges inner, end, outer, start."""

    def p(r, angle):
        return r * math.cos(angle), r * math.sin(angle)

    mid = 0.5 * (angle0 + angle1)
    points = [p(r0, angle0), p(r1, angle0), p(r1, angle1), p(r0, angle1)]
    names = dict(enumerate(("start", "outer", "end", "inner")))
    return outline(name, points, names, {1: p(r1, mid), 3: p(r0, mid)})


def moved(shape, turn=0.0, mirror=False, shift=(0.0, 0.0), scale=1.0):
    """Return an outline turned, mirrored, scaled and shifted."""

    def m(point):
        z = complex(*point)
        z = z.conjugate() if mirror else z
        z = scale * z * complex(math.cos(turn), math.sin(turn)) + complex(*shift)
        return z.real, z.imag

    edges = tuple(OutlineEdge(e.name, None if e.via is None else m(e.via)) for e in shape.edges)
    return Outline(shape.name, shape.solid, tuple(m(v) for v in shape.vertices), edges)


def cells_crossed(mesh, start, end, region=None):
    """Return through how many cells (of a region) the straight line from start to end runs."""
    a, b = np.asarray(start, float), np.asarray(end, float)
    p = mesh.points[mesh.cells]
    lo, hi = np.zeros(len(p)), np.ones(len(p))
    for i in range(3):  # clip the line by each side of each triangle
        q, side = p[:, i], np.roll(p, -1, axis=1)[:, i] - p[:, i]
        at_a = side[:, 0] * (a[1] - q[:, 1]) - side[:, 1] * (a[0] - q[:, 0])
        at_b = side[:, 0] * (b[1] - q[:, 1]) - side[:, 1] * (b[0] - q[:, 0])
        slope = at_b - at_a
        with np.errstate(divide="ignore", invalid="ignore"):
            t = -at_a / slope
        lo = np.where(slope > 0, np.maximum(lo, t), lo)
        hi = np.where(slope < 0, np.minimum(hi, t), hi)
        hi = np.where((slope == 0) & (at_a < 0), -1.0, hi)
    crossed = hi - lo > 1e-9
    return int(np.count_nonzero(crossed if region is None else crossed & (mesh.region == region)))
