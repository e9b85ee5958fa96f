"""How people write units: their spellings turned into those that pint reads."""

import re

SPELLED = {
    "W/m2K": "W/(m^2 K)",
    "W/m^2K": "W/(m^2 K)",
    "kW/m2K": "kW/(m^2 K)",
    "kW/m^2K": "kW/(m^2 K)",
    "W/mK": "W/(m K)",
    "J/kgK": "J/(kg K)",
    "kJ/kgK": "kJ/(kg K)",
}
"""Spellings without a bracket that the trade uses and that read otherwise by the rules of algebra."""

UNIT_TEXT = re.compile(r"[A-Za-zµμΩ°%/*^() _·⋅²³0-9.\-]{1,40}")
POWER = re.compile(r"(?:\^|\*\*)\s*-?\d(?!\d)")


def tidy_unit(text: str) -> str:
    """Return a unit as pint reads it: degrees spelled out, powers marked, trade spellings resolved.

    C is never coulomb and F never farad here.

    Examples
    --------
    >>> tidy_unit("°C/h"), tidy_unit("W/m2K"), tidy_unit("kg/m³")
    ('degC/h', 'W/(m^2 K)', 'kg/m^3')
    """
    text = text.strip().replace("²", "^2").replace("³", "^3").replace("·", "*").replace("⋅", "*")
    text = re.sub(r"(?<![A-Za-z_])([CF])(?![A-Za-z_])", r"deg\1", re.sub(r"°\s*([CFK])", r" \1", text)).strip()
    text = re.sub(r"(?<![A-Za-z_])([cmd]?m|ft|in)([23])(?![0-9])", r"\1^\2", text)
    bare = re.sub(r"[\s*]", "", text)
    return SPELLED.get(bare, SPELLED.get(bare.replace("degC", "K"), text))


def is_unit_text(tidy: str) -> bool:
    """Return whether a text can be a unit at all: short, no strange signs, powers of one digit.

    It keeps whatever a file holds from being worked out as arithmetic.
    """
    return bool(UNIT_TEXT.fullmatch(tidy)) and len(POWER.findall(tidy)) == len(re.findall(r"\^|\*\*", tidy))
