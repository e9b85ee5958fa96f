"""A doubt or a remark that a check leaves in the record."""

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Finding:
    """What a check found.

    Attributes
    ----------
    check : str
        Which check, one word.
    message : str
        What was found, with its number and place, for a person.
    close : str
        What would close it; empty for a remark that needs nothing.
    x, y : float or None
        Place in the section, m.
    blocks : bool
        True when the standing stays open until it is closed; False for a remark.
    """

    check: str
    message: str
    close: str = ""
    x: float | None = None
    y: float | None = None
    blocks: bool = field(default=False, kw_only=True)
