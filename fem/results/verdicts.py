"""What can be said of a limit."""

from dataclasses import dataclass
from enum import Enum

import numpy as np


class Call(Enum):
    """What can be said of a limit."""

    met = "met"
    not_met = "not met"
    too_close = "too close to call"


@dataclass(frozen=True)
class Verdict:
    """A limit held against the histories.

    Attributes
    ----------
    limit : str
        The limit's name.
    text : str
        The limit as a sentence, without numbers of the result.
    call : Call
    margin : float
        K, or K/s for a rate limit; positive on the good side.
    band : float
        Of the margin, same unit; infinite when there is none.
    t : float
        The critical instant, s.
    crossing : tuple of float or None
        For limits that ask to reach a temperature: when it is reached, s, and the earliest and latest instant that the band allows
        (infinite where it is not certain within the clock).
    is_rate : bool
        True when the margin is in K/s.
    """

    limit: str
    text: str
    call: Call
    margin: float
    band: float
    t: float
    crossing: tuple[float, float, float] | None = None
    is_rate: bool = False

    @property
    def bands(self) -> float:
        """Return the margin in bands."""
        return self.margin / self.band if self.band > 0 else np.copysign(np.inf, self.margin)
