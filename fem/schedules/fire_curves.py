"""The nominal temperature-time curves of EN 1991-1-2:2002, 3.2: gas temperatures in a fire compartment by convention.

They are conventions for comparison and design, not forecasts of a fire; local codes and licensed practice decide which
one applies.
"""

from collections.abc import Callable
from typing import Any, Literal

import numpy as np

from fem.laws import Break, Law

Curve = Literal["standard", "external", "hydrocarbon"]

MINUTE = 60.0
"""s; the standard's formulas take minutes."""

COOLEST = 293.15
"""K, the 20 degC at which every curve of the standard begins."""


def standard(minutes: Any) -> Any:
    """Return the rise of the standard curve over its start, K (EN 1991-1-2:2002, 3.2.1, formula 3.4)."""
    return 345.0 * np.log10(8.0 * minutes + 1.0)


def external(minutes: Any) -> Any:
    """Return the rise of the external fire curve over its start, K (EN 1991-1-2:2002, 3.2.2, formula 3.5)."""
    return 660.0 * (1.0 - 0.687 * np.exp(-0.32 * minutes) - 0.313 * np.exp(-3.8 * minutes))


def hydrocarbon(minutes: Any) -> Any:
    """Return the rise of the hydrocarbon curve over its start, K (EN 1991-1-2:2002, 3.2.3, formula 3.6)."""
    return 1080.0 * (1.0 - 0.325 * np.exp(-0.167 * minutes) - 0.675 * np.exp(-2.5 * minutes))


CURVES: dict[Curve, Callable[[Any], Any]] = {
    "standard": standard,
    "external": external,
    "hydrocarbon": hydrocarbon,
}


def fire_law(curve: Curve, *, ambient: float, starts_at: float) -> Law:
    """Return the gas temperature, K, as a law of t [s].

    Parameters
    ----------
    curve : {"standard", "external", "hydrocarbon"}
    ambient : float
        K, before the fire. The standard says 20 degC; another value moves the whole curve by the difference.
    starts_at : float
        s, when the fire starts: the law kinks there, it does not jump.
    """
    rise = CURVES[curve]

    def evaluate(t: Any) -> Any:
        return ambient + rise(np.maximum(t - starts_at, 0.0) / MINUTE)

    return Law(evaluate, frozenset({"t"}), (Break(starts_at, jump=False),), f"{curve} fire curve")
