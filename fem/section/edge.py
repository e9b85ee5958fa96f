"""One edge of an outline: a straight line or a circular arc, exact.

Inside the modules on geometry a point is a complex number x + iy, m.
"""

import cmath
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Complexes = NDArray[np.complex128]
Floats = NDArray[np.float64]


def cross(a: complex, b: complex) -> float:
    """Return the z component of the cross product of two plane vectors."""
    return a.real * b.imag - a.imag * b.real


@dataclass(frozen=True)
class Edge:
    """A line or an arc from `start` to `end`.

    Attributes
    ----------
    start, end : complex
        m.
    centre : complex or None
        Of an arc, m; None for a line.
    radius : float
        Of an arc, m; 0 for a line.
    sweep : float
        Signed angle that an arc runs through, rad, positive counter-clockwise, at most one turn; 0 for a line.
    """

    start: complex
    end: complex
    centre: complex | None = None
    radius: float = 0.0
    sweep: float = 0.0

    @property
    def length(self) -> float:
        """Return the exact length, m."""
        return abs(self.end - self.start) if self.centre is None else self.radius * abs(self.sweep)

    @property
    def hub(self) -> complex:
        """Return the centre of an arc, m; only for arcs."""
        if self.centre is None:
            raise TypeError("a line has no centre")
        return self.centre

    @property
    def middle(self) -> complex:
        """Return the point half-way along, m."""
        return complex(self.at(np.array([0.5]))[0])

    @property
    def area(self) -> float:
        """Return this edge's part of the area of a closed loop (Green), m2: half of the integral of x dy - y dx."""
        half = 0.5 * cross(self.start, self.end)
        if self.centre is None:
            return half
        return half + 0.5 * self.radius**2 * (self.sweep - math.sin(self.sweep))

    def reversed(self) -> "Edge":
        """Return the edge run backwards."""
        return Edge(self.end, self.start, self.centre, self.radius, -self.sweep)

    def at(self, fraction: Floats) -> Complexes:
        """Return the points at fractions (n,) of the length; 0 and 1 give the ends exactly."""
        f = np.asarray(fraction, dtype=np.float64)
        if self.centre is None:
            z = self.start + f * (self.end - self.start)
        else:
            z = self.centre + (self.start - self.centre) * np.exp(1j * self.sweep * f)
        return np.asarray(np.where(f == 0.0, self.start, np.where(f == 1.0, self.end, z)), dtype=np.complex128)

    def tangent(self, fraction: Floats) -> Complexes:
        """Return unit tangents in the running direction at fractions (n,)."""
        f = np.asarray(fraction, dtype=np.float64)
        if self.centre is None:
            d = self.end - self.start
            return np.full(f.shape, d / abs(d), dtype=np.complex128)
        spoke = (self.start - self.centre) / self.radius
        return np.asarray(1j * math.copysign(1.0, self.sweep) * spoke * np.exp(1j * self.sweep * f))

    def fraction(self, z: Complexes) -> Floats:
        """Return at which fractions of the length the nearest points of the extended edge to points (n,) lie."""
        z = np.asarray(z, dtype=np.complex128)
        if self.centre is None:
            d = self.end - self.start
            return np.asarray(((z - self.start) * np.conj(d)).real / abs(d) ** 2)
        turn = np.angle((z - self.centre) / (self.start - self.centre)) * math.copysign(1.0, self.sweep)
        span = abs(self.sweep)
        turn = np.where(turn < 0.5 * (span - 2.0 * math.pi), turn + 2.0 * math.pi, turn)
        return np.asarray(turn / span)

    def distance(self, z: Complexes) -> Floats:
        """Return the distance of points (n,) from the edge, m."""
        z = np.asarray(z, dtype=np.complex128)
        inside = np.clip(self.fraction(z), 0.0, 1.0)
        return np.asarray(np.abs(z - self.at(inside)))

    def box(self) -> tuple[complex, complex]:
        """Return two corners of a box around the edge: around the whole circle of an arc, which is simple and safe."""
        if self.centre is not None:
            reach = complex(self.radius, self.radius)
            return self.centre - reach, self.centre + reach
        low = complex(min(self.start.real, self.end.real), min(self.start.imag, self.end.imag))
        return low, self.start + self.end - low

    def near(self, z: Complexes, tolerance: float) -> NDArray[np.intp]:
        """Return which of the points (n,) lie within the tolerance of the edge."""
        low, high = self.box()
        x, y = z.real, z.imag
        inside = (x >= low.real - tolerance) & (x <= high.real + tolerance)
        maybe = np.flatnonzero(inside & (y >= low.imag - tolerance) & (y <= high.imag + tolerance))
        return np.asarray(maybe[self.distance(z[maybe]) <= tolerance])

    def between(self, a: complex, b: complex, *, from_fraction: float, to_fraction: float) -> "Edge":
        """Return the piece between two points on the edge (at the given fractions); carrier unchanged."""
        if self.centre is None:
            return Edge(a, b)
        return Edge(a, b, self.centre, self.radius, self.sweep * (to_fraction - from_fraction))

    def polyline(self, sagitta: float) -> Complexes:
        """Return points from start to end (both included) whose chords stay within `sagitta` of the edge."""
        if self.centre is None:
            return np.array([self.start, self.end])
        step = 2.0 * math.acos(max(1.0 - sagitta / self.radius, 0.5))
        return self.at(np.linspace(0.0, 1.0, max(2, math.ceil(abs(self.sweep) / step)) + 1))


FLATTEST_ARC = 1e-6
"""An arc that rises over its chord by less than this part of it counts as straight; common practice, no source."""


def arc_through(start: complex, via: complex, end: complex) -> Edge | None:
    """Return the arc from `start` through `via` to `end`; None when the three points do not span a circle."""
    b, v = end - start, via - start
    longest = max(abs(b), abs(v), abs(b - v))
    if min(abs(b), abs(v), abs(end - via)) <= FLATTEST_ARC * longest or abs(cross(b, v)) <= FLATTEST_ARC * longest**2:
        return None
    bb, vv, d = abs(b) ** 2, abs(v) ** 2, 2.0 * cross(b, v)
    centre = start + complex((bb * v.imag - vv * b.imag) / d, (b.real * vv - v.real * bb) / d)
    turn = cmath.phase((end - centre) / (start - centre)) % (2.0 * math.pi)
    sweep = turn if d < 0.0 else turn - 2.0 * math.pi  # via to the right of the chord: counter-clockwise
    return Edge(start, end, centre, abs(start - centre), sweep)


def crossings(a: Edge, b: Edge, tolerance: float) -> list[complex]:
    """Return where two edges cross or touch, besides stretches along which they coincide."""
    if a.centre is None and b.centre is None:
        found = _line_line(a, b)
    elif a.centre is not None and b.centre is not None:
        found = _circle_circle(a, b, tolerance)
    else:
        line, arc = (a, b) if a.centre is None else (b, a)
        found = _line_circle(line, arc, tolerance)
    z = np.array(found, dtype=np.complex128)
    if not len(z):
        return []
    return [complex(p) for p in z[(a.distance(z) <= tolerance) & (b.distance(z) <= tolerance)]]


def _line_line(a: Edge, b: Edge) -> list[complex]:
    u, v = a.end - a.start, b.end - b.start
    d = cross(u, v)
    if abs(d) <= 1e-12 * abs(u) * abs(v):  # parallel: at most a common stretch, which its ends reveal
        return []
    return [a.start + u * (cross(b.start - a.start, v) / d)]


def _line_circle(line: Edge, arc: Edge, tolerance: float) -> list[complex]:
    centre = arc.hub
    u = (line.end - line.start) / abs(line.end - line.start)
    foot = line.start + u * ((centre - line.start) * u.conjugate()).real
    d = abs(foot - centre)
    if abs(d - arc.radius) <= tolerance:
        return [foot]
    if d > arc.radius:
        return []
    half = math.sqrt((arc.radius - d) * (arc.radius + d))
    return [foot - half * u, foot + half * u]


def _circle_circle(a: Edge, b: Edge, tolerance: float) -> list[complex]:
    ca, cb = a.hub, b.hub
    d = abs(cb - ca)
    if d <= tolerance:  # concentric: the same circle or no common point
        return []
    u = (cb - ca) / d
    if abs(d - a.radius - b.radius) <= tolerance or abs(d + b.radius - a.radius) <= tolerance:
        return [ca + a.radius * u]
    if abs(d + a.radius - b.radius) <= tolerance:
        return [ca - a.radius * u]
    if d > a.radius + b.radius or d < abs(a.radius - b.radius):
        return []
    along = (d * d + a.radius**2 - b.radius**2) / (2.0 * d)
    half = math.sqrt(max(a.radius**2 - along**2, 0.0))
    return [ca + complex(along, -half) * u, ca + complex(along, half) * u]


def winding(loop: Sequence[Edge], z: Complexes) -> NDArray[np.int_]:
    """Return how often a closed loop of edges runs counter-clockwise around points (n,) that do not lie on it.

    Chords turn by their angle; an arc adds a full turn where the point lies between it and its chord.
    """
    z = np.asarray(z, dtype=np.complex128)
    turn = np.zeros(z.shape)
    for edge in loop:
        u, w = edge.start - z, edge.end - z
        side = u.real * w.imag - u.imag * w.real + 0.0  # a point on the chord itself counts as left of it, both times
        turn += np.arctan2(side, u.real * w.real + u.imag * w.imag)
        if edge.centre is not None:
            beyond_chord = side < 0.0 if edge.sweep > 0.0 else side >= 0.0
            bow = beyond_chord & (np.abs(z - edge.centre) < edge.radius)
            turn += np.where(bow, math.copysign(2.0 * math.pi, edge.sweep), 0.0)
    return np.asarray(np.rint(turn / (2.0 * math.pi)), dtype=np.int_)
