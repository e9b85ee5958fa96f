"""The heat ledger: what came in, what was made, what is stored, and what does not close."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Ledger:
    """Heat, J (per metre of depth when planar); of a steady state: W times one second.

    Attributes
    ----------
    through : tuple of (str, float)
        In through each face.
    made : tuple of (str, float)
        In each region with a source.
    stored, unexplained, turned_over : float
        `turned_over` is the sum of all heat that went in or out or was made, step by step, or what the nodes exchanged if that is more.
    """

    through: tuple[tuple[str, float], ...]
    made: tuple[tuple[str, float], ...]
    stored: float
    unexplained: float
    turned_over: float

    @property
    def part(self) -> float:
        """Return the unexplained part of the heat turned over."""
        return abs(self.unexplained) / self.turned_over if self.turned_over > 0 else 0.0
