"""What outlines must be together: nobody wholly covered, nothing thinner than the gap tolerance, no gap unnoticed."""

from collections.abc import Iterable, Sequence

from fem.errors import Problem, SectionError
from fem.quantities.units import SI, FileUnits, in_unit, said_place
from fem.section.edge import Complexes
from fem.section.faces import Loop, nest, sectors, walk
from fem.section.narrow import Shapes, Spot
from fem.section.outline import Outline
from fem.section.partition import NOBODY, Link, divide

Nested = Sequence[tuple[Loop, list[Loop]]]


def loops_of(links: Sequence[Link], nodes: Complexes) -> list[Loop]:
    """Return all loops.

    Raises
    ------
    SectionError
        If edges run so close to each other that it can't be told who lies where.
    """
    try:
        return walk(links, nodes)
    except ValueError as spot:
        x, y = spot.args
        allowed = "edges that either coincide or keep apart"
        hint = "move the edges that almost coincide here onto each other, or apart"
        raise SectionError.single(
            "section", "a tangle of edges that almost coincide", allowed, hint, xy=(x, y)
        ) from None


def thin_voids(outlines: Sequence[Outline], size: float, tolerance: float, units: FileUnits = SI) -> list[Problem]:
    """Return the voids that are hair-thin somewhere; messages in the units."""
    found = []
    for outline in outlines:
        if not outline.solid:
            nodes, links = divide([outline], [], size)
            shapes = Shapes(links, nodes, nest(loops_of(links, nodes)), tolerance)
            found += [_thin([outline], links, spot, tolerance, units) for spot in shapes.thin()]
    return found


def check_partition(
    outlines: Sequence[Outline],
    links: Sequence[Link],
    nested: Nested,
    spots: Iterable[Spot],
    tolerance: float,
    *,
    tried: bool,
    units: FileUnits = SI,
) -> list[Problem]:
    """Return every fault of the outlines together.

    Parameters
    ----------
    outlines, links, nested
        The partition.
    spots : iterable of Spot
        Where it is too narrow.
    tolerance : float
        Gap tolerance, m.
    tried : bool
        Whether closing the gaps was tried.
    units : FileUnits
        Of the lengths in messages.
    """
    found = _covered(outlines, nested)
    for spot in spots:
        found.append(
            _gap(outlines, links, spot, tolerance, units, tried=tried)
            if spot.owner == NOBODY
            else _thin(outlines, links, spot, tolerance, units)
        )
    return found


def _covered(outlines: Sequence[Outline], nested: Nested) -> list[Problem]:
    shown = {outer.owner for outer, _ in nested}
    found = []
    for o, outline in enumerate(outlines):
        if outline.solid and o not in shown:
            later = ", ".join(f'"{other.name}"' for other in outlines[o + 1 :])
            x, y = outline.vertices[0]
            hint = f"draw it after the outlines that cover it ({later}), or take it away"
            allowed = "a region of which something is left when later ones have cut it"
            found.append(Problem(outline.place(), "a region that later ones cover wholly", allowed, hint, xy=(x, y)))
    return found


def edge_place(outlines: Sequence[Outline], link: Link, *, of: int | None = None) -> str:
    """Return in words which outline edge a link lies on, of the given outline if it lies on one of its edges."""
    mine = [origin for origin in link.origins if origin[0] == of]
    outline, position = (mine or link.origins)[-1]
    return outlines[outline].place(position)


def _xy(z: complex) -> tuple[float, float]:
    return float(z.real), float(z.imag)


def _thin(
    outlines: Sequence[Outline], links: Sequence[Link], spot: Spot, tolerance: float, units: FileUnits
) -> Problem:
    outline = outlines[spot.owner]
    between = " and ".join(dict.fromkeys(edge_place(outlines, links[i], of=spot.owner) for i in spot.links))
    allowed = f"parts wider than the gap tolerance of {_width(tolerance, units)}"
    hint = "widen the part, or move the edges onto each other; if it is meant, lower gap_tolerance"
    value = f"a width of {_width(spot.width, units)}"
    return Problem(f"{outline.place()}, between {between}", value, allowed, hint, xy=_xy(spot.z))


def _width(metres: float, units: FileUnits) -> str:
    """Return a width for a message: three digits, which is what a gap is known to."""
    unit = units.of("length")
    return f"{in_unit(metres, unit, 'length'):.3g} {unit}"


def gap_sides(outlines: Sequence[Outline], links: Sequence[Link], spot: Spot) -> str:
    """Return in words between which edges a gap lies."""
    sides = [edge_place(outlines, links[i], of=max(links[i].left, links[i].right)) for i in spot.links]
    return " and ".join(dict.fromkeys(sides))


def _gap(
    outlines: Sequence[Outline],
    links: Sequence[Link],
    spot: Spot,
    tolerance: float,
    units: FileUnits,
    *,
    tried: bool,
) -> Problem:
    hint = "draw the edges onto each other; if the gap is meant, lower gap_tolerance"
    if tried:
        value = f"a gap of {_width(spot.width, units)}, which moving points onto the other outline did not close,"
    else:
        value = f"a gap of {_width(spot.width, units)} (it was not closed)"
        hint = "draw the edges onto each other, or set close_gaps = true; if the gap is meant, lower gap_tolerance"
    allowed = f"regions that touch, or are apart by more than the gap tolerance of {_width(tolerance, units)}"
    return Problem(f"between {gap_sides(outlines, links, spot)}", value, allowed, hint, xy=_xy(spot.z))


def closed_notes(
    outlines: Sequence[Outline], links: Sequence[Link], gaps: Iterable[Spot], units: FileUnits = SI
) -> list[str]:
    """Return a note on each gap that was closed."""
    return [
        f"closed a gap of {_width(spot.width, units)} between {gap_sides(outlines, links, spot)} "
        f"at {said_place(*_xy(spot.z), units)}"
        for spot in gaps
    ]


def point_contacts(
    outlines: Sequence[Outline], links: Sequence[Link], nodes: Complexes, units: FileUnits = SI
) -> list[str]:
    """Return a note on each node around which the outside appears twice: parts touch there in one point only."""
    around: dict[int, list[int]] = {}
    for sector in sectors(links, nodes):
        around.setdefault(sector.node, []).append(sector.owner)
    notes = []
    for node, owners in around.items():
        if owners.count(NOBODY) > 1:
            names = " and ".join(dict.fromkeys(f'region "{outlines[o].name}"' for o in owners if o != NOBODY))
            z = nodes[node]
            notes.append(
                f"parts of {names} touch in one point only, at {said_place(*_xy(z), units)}: "
                f"the mesh ties them there, though a point conducts no heat"
            )
    return notes


def narrow_spots(
    links: Sequence[Link], nodes: Complexes, nested: Nested, tolerance: float
) -> tuple[list[Spot], list[Spot]]:
    """Return where regions are hair-thin, and the gaps between them."""
    shapes = Shapes(links, nodes, nested, tolerance)
    return shapes.thin(), shapes.gaps()
