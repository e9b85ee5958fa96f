"""The physical quantities that a docket can hold: SI unit, accepted spellings and bounds of each. Data only."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Kind:
    """A physical quantity that a docket can hold.

    Attributes
    ----------
    name : str
        In the user's words.
    si : str
        The SI unit in which it is held, as pint reads it; empty for a pure number.
    examples : str
        Spellings that are accepted, for messages.
    lowest, highest : float
        Bounds, SI. They refuse slips of the pen (a factor 1000), not unusual jobs; our own judgement, no source.
    open_low : bool
        True when the lower bound itself is refused.
    absolute : bool
        True for temperatures proper, whose zero moves with the unit; False for everything else, differences included.
    """

    name: str
    si: str
    examples: str
    lowest: float
    highest: float
    open_low: bool = False
    absolute: bool = False


KINDS = {
    kind.name: kind
    for kind in (
        Kind("length", "m", '"12 mm", "0.3 m", "2 in"', -1e5, 1e5),
        Kind("time", "s", '"30 s", "45 min", "2 h"', -1e11, 1e11),
        Kind("temperature", "K", '"20 degC", "293.15 K", "850 degF"', 0.0, 1e5, absolute=True),
        Kind("temperature difference", "K", '"5 K", "5 degC", "9 degF"', 0.0, 1e5),
        Kind("heating rate", "K/s", '"5 K/min", "100 degC/h"', 0.0, 1e7, open_low=True),
        Kind("heat flux", "W/m^2", '"800 W/m2", "3 kW/m^2"', -1e12, 1e12),
        Kind("film coefficient", "W/(m^2 K)", '"25 W/(m2 K)", "25 W/m2K"', 0.0, 1e10),
        Kind("heat source", "W/m^3", '"5000 W/m3", "5 kW/m^3"', -1e15, 1e15),
        Kind("conductivity", "W/(m K)", '"1.1 W/(m K)", "1.1 W/mK"', 0.0, 1e6, open_low=True),
        Kind("density", "kg/m^3", '"2000 kg/m3", "2 g/cm^3"', 0.0, 1e6, open_low=True),
        Kind("specific heat", "J/(kg K)", '"880 J/(kg K)", "0.88 kJ/kgK"', 0.0, 1e8, open_low=True),
        Kind("fraction", "", '0.85, "85 %"', 0.0, 1.0),
        Kind("number", "", "1.5", -1e12, 1e12),
        Kind("seconds", "s", '120, "2 min"', 0.0, 1e8, open_low=True),
        Kind(
            "heat",
            "W/m or W, J/m or J",
            "50 (a plain number: per metre when planar, whole for a revolution)",
            0.0,
            1e15,
            open_low=True,
        ),
    )
}
"""Every kind by its name. Bare seconds and bare heat are never in the file's units: the field says in which unit."""
