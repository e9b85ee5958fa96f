"""Geometry of a reference case -> outlines: (name, stock, vertices) with named edges and arcs by a point passed through."""

from dataclasses import dataclass
from typing import Any

import numpy as np

Point = tuple[float, float]


@dataclass(frozen=True)
class Piece:
    """One edge of an outline: where it starts, its name, and a point passed through when it is an arc."""

    start: Point
    name: str
    via: Point | None


@dataclass(frozen=True)
class Shape:
    """One outline; `region` is None for a hole."""

    name: str
    region: str | None
    pieces: tuple[Piece, ...]

    def area(self) -> float:
        """Return the enclosed area of a fine polyline, m2."""
        p = np.array(
            [q for piece in self.pieces for q in ([piece.start] if piece.via is None else [piece.start, piece.via])]
        )
        x, y = p.T
        return float(abs(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y)) / 2)


def pieces_of(geometry: dict[str, Any], loop: list[str]) -> tuple[Piece, ...]:
    """Return the edges of a loop of curve names, `-name` run backwards."""
    found: list[Piece] = []
    for entry in loop:
        name = entry.removeprefix("-")
        found += _curve(geometry, name, backwards=entry.startswith("-"))
    return tuple(found)


def _curve(geometry: dict[str, Any], name: str, *, backwards: bool) -> list[Piece]:
    curve, points = geometry["curves"][name], geometry["points"]
    a, b = (np.array(points[curve[end]], dtype=float) for end in ("from", "to"))
    if curve["type"] == "line":
        return [Piece(_pair(b if backwards else a), name, None)]
    centre = np.array(points[curve["center"]], dtype=float)
    turn = 1.0 if curve["direction"] == "ccw" else -1.0
    first = np.arctan2(*(a - centre)[::-1])
    sweep = (turn * (np.arctan2(*(b - centre)[::-1]) - first)) % (2.0 * np.pi) or 2.0 * np.pi
    radius = float(np.linalg.norm(a - centre))
    halves = 2 if sweep > np.pi * 1.5 else 1  # a full circle has no two ends
    angles = first + turn * sweep * np.linspace(0.0, 1.0, 2 * halves + 1)
    p = [_pair(centre + radius * np.array([np.cos(s), np.sin(s)])) for s in angles]
    p[0], p[-1] = _pair(a), _pair(b)
    if backwards:
        p = p[::-1]
    return [Piece(p[2 * i], name, p[2 * i + 1]) for i in range(halves)]


def _pair(p: np.ndarray) -> Point:
    return float(p[0]), float(p[1])


def shapes_of(geometry: dict[str, Any]) -> list[Shape]:
    """Return all outlines in drawing order: larger ones first, each region's holes right after it, so that later ones fill them."""
    regions = []
    for region in geometry["regions"]:
        outer = Shape(region["id"], region["id"], pieces_of(geometry, region["loops"][0]))
        holes = [
            Shape(f"{region['id']} hole {i}", None, pieces_of(geometry, loop))
            for i, loop in enumerate(region["loops"][1:], 1)
        ]
        regions.append((outer.area(), [outer, *holes]))
    return [shape for _, shapes in sorted(regions, key=lambda entry: -entry[0]) for shape in shapes]
