"""The units in which a file speaks, and what else a docket is read with. No conversion happens here."""

from dataclasses import dataclass, replace
from typing import Any

from fem.errors import DocketError, shown
from fem.quantities.kinds import KINDS
from fem.quantities.unit_text import tidy_unit

LENGTHS = ("mm", "cm", "m", "in")
TIMES = ("s", "min", "h")
TEMPERATURES = ("degC", "K", "degF")


@dataclass(frozen=True)
class FileUnits:
    """The units in which a file speaks; the default is SI and kelvin.

    Attributes
    ----------
    length : {"mm", "cm", "m", "in"}
    time : {"s", "min", "h"}
    temperature : {"degC", "K", "degF"}

    Raises
    ------
    DocketError
        If one is not among these.
    """

    length: str = "m"
    time: str = "s"
    temperature: str = "K"

    def __post_init__(self) -> None:
        for name, choices in (("length", LENGTHS), ("time", TIMES), ("temperature", TEMPERATURES)):
            given = getattr(self, name)
            tidy = tidy_unit(given) if isinstance(given, str) else given
            if tidy not in choices:
                raise DocketError.single(
                    f"docket, {name}",
                    shown(given),
                    ", ".join(choices),
                    f'write {name} = "{choices[0]}" or another of these',
                )
            object.__setattr__(self, name, tidy)

    def of(self, kind: str) -> str:
        """Return the unit of a bare number of this kind, as pint reads it; a difference never has an offset."""
        step = {"degC": "K", "K": "K", "degF": "delta_degF"}[self.temperature]
        own = {
            "length": self.length,
            "time": self.time,
            "temperature": self.temperature,
            "temperature difference": step,
            "heating rate": f"{step}/{self.time}",
        }
        return own.get(kind, KINDS[kind].si)


SI = FileUnits()


@dataclass(frozen=True)
class Reading:
    """Validation context of a docket: more than its units.

    Attributes
    ----------
    units : FileUnits
        Of bare numbers.
    kind : str
        What the values of the schedule are that is being read; empty outside one.
    logs : object or None
        Where logs are found (`fem.schedules.logs.LogFolder`); None while a part is made on its own in Python.
    """

    units: FileUnits = SI
    kind: str = ""
    logs: Any = None

    def of_kind(self, kind: str) -> "Reading":
        """Return the same reading inside a schedule of values of this kind."""
        return replace(self, kind=kind)


def reading(context: Any) -> Reading:
    """Return the context of a validation as a `Reading`; none at all means Python, SI and kelvin."""
    if isinstance(context, Reading):
        return context
    return Reading(units=context if isinstance(context, FileUnits) else SI)
