"""What the solver is asked: laws on regions and faces, and the instants at which they are not smooth. No files, no mesh."""

from collections.abc import Iterable
from dataclasses import dataclass, field

from fem.laws import Break, Law

STEFAN_BOLTZMANN = 5.670374419e-8
"""W/(m2 K4), exact in the SI of 2019 to the digits given (CODATA 2018)."""


@dataclass(frozen=True)
class Film:
    """Heat from a fluid: q = coefficient (ambient - T_surface).

    Attributes
    ----------
    coefficient : Law
        W/(m2 K), of t, x, y and the surface temperature T.
    ambient : Law
        K, of t, x, y.
    """

    coefficient: Law
    ambient: Law


@dataclass(frozen=True)
class Radiant:
    """Heat from wide surroundings (view factor 1): q = emissivity sigma (surroundings^4 - T_surface^4).

    Attributes
    ----------
    emissivity : Law
        -, of t, x, y, T.
    surroundings : Law
        K, of t, x, y.
    sigma : float
        Stefan-Boltzmann constant, W/(m2 K4).
    """

    emissivity: Law
    surroundings: Law
    sigma: float = STEFAN_BOLTZMANN


@dataclass(frozen=True)
class Face:
    """One exposure on one named stretch of the section's outside.

    Attributes
    ----------
    name : str
        The exposure's name; heat is totalled over the faces of one name.
    edge : str
        The edge's name, for the ledger.
    curves : tuple of int
        Indices into the plan's curves.
    held : Law or None
        Temperature that the face is held at, K, of t, x, y. Stands alone.
    fluxes : tuple of Law
        Heat fluxes into the section, W/m2.
    films, radiants : tuple
        Added to the fluxes.
    """

    name: str
    edge: str
    curves: tuple[int, ...]
    held: Law | None = None
    fluxes: tuple[Law, ...] = ()
    films: tuple[Film, ...] = ()
    radiants: tuple[Radiant, ...] = ()

    def laws(self) -> tuple[Law, ...]:
        """Return every law of this face."""
        own = () if self.held is None else (self.held,)
        films = tuple(law for film in self.films for law in (film.coefficient, film.ambient))
        radiants = tuple(law for radiant in self.radiants for law in (radiant.emissivity, radiant.surroundings))
        return own + self.fluxes + films + radiants


@dataclass(frozen=True)
class Problem:
    """One conduction problem on a plan; every tuple over regions follows the plan's region order.

    Attributes
    ----------
    revolution : bool
        True for a body of revolution: x is the radius, heat is for the full turn.
    conductivity : tuple of Law
        W/(m K), of T (and t, x, y).
    heat_capacity : tuple of Law
        Density times specific heat, J/(m3 K), of T (and x, y).
    source : tuple of (Law or None)
        W/m3, of t, x, y, T; positive heats.
    start : tuple of Law
        K, of x, y.
    faces : tuple of Face
        Edges without one are insulated.
    begin, end : float or None
        s; both None for a steady problem.
    report_every : float
        s, spacing of the reporting times.
    instants : tuple of float
        s, on which the march lands exactly besides the breaks.
    """

    revolution: bool
    conductivity: tuple[Law, ...]
    heat_capacity: tuple[Law, ...]
    source: tuple[Law | None, ...]
    start: tuple[Law, ...]
    faces: tuple[Face, ...]
    begin: float | None = None
    end: float | None = None
    report_every: float = 0.0
    instants: tuple[float, ...] = field(default=())

    @property
    def steady(self) -> bool:
        """True when no clock was given."""
        return self.end is None

    def laws(self) -> Iterable[Law]:
        """Return every law that the march evaluates."""
        yield from self.conductivity
        yield from self.heat_capacity
        yield from (law for law in self.source if law is not None)
        for face in self.faces:
            yield from face.laws()

    def breaks(self) -> tuple[Break, ...]:
        """Return the instants strictly inside the clock at which data jump or kink, or on which to land; one per instant."""
        if self.begin is None or self.end is None:
            return ()
        jumps: dict[float, bool] = dict.fromkeys(self.instants, False)
        for law in self.laws():
            for b in law.breaks:
                jumps[b.t] = jumps.get(b.t, False) or b.jump
        slack = 1e-12 * (self.end - self.begin)  # an instant closer than rounding to the ends is the end
        return tuple(Break(t, jumps[t]) for t in sorted(jumps) if self.begin + slack < t < self.end - slack)

    def totals(self) -> tuple[str, ...]:
        """Return the exposures' names, once each, in order."""
        return tuple(dict.fromkeys(face.name for face in self.faces))
