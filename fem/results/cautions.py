"""What a user must be told beside the numbers, whenever the job is of that sort."""

import tomllib
from typing import Any

from fem.results.record import Record

RESPONSIBILITY = "A result is its user's responsibility."
HOT = 333.15
"""K. Above about 60 degC a metal surface burns skin within seconds; common practice, no source."""


def cautions(record: Record) -> tuple[str, ...]:
    """Return the cautions that a record calls for; none for a cool and peaceful job."""
    told = []
    if speaks_of_fire(record.docket_text):
        told.append(
            "Fire: this is a temperature calculation, no proof of fire resistance. "
            "Local codes and licensed practice decide what is safe."
        )
    if record.fields.peak.size and float(record.fields.peak.max()) > HOT:
        told.append(
            "Hot parts: furnaces, kilns and heated parts burn, crack and start fires. "
            "Local codes and licensed practice decide how they are built, fired and handled."
        )
    return tuple(told)


def speaks_of_fire(docket_text: str) -> bool:
    """Return whether a docket uses a fire curve anywhere.

    Examples
    --------
    >>> speaks_of_fire('exposure = [{ film = { ambient = { fire = "standard" } } }]'), speaks_of_fire('title = "fire"')
    (True, False)
    """
    return _holds(tomllib.loads(docket_text.replace("\r\n", "\n")), "fire")


def _holds(part: Any, key: str) -> bool:
    if isinstance(part, dict):
        return key in part or any(_holds(value, key) for value in part.values())
    return isinstance(part, list) and any(_holds(value, key) for value in part)
