"""Numbers rounded for people: as many digits as a band supports, and never an interval narrower than the one given."""

import math
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Context, Decimal

BAND_DIGITS = 2
"""Significant digits of a written band: JCGM 100:2008 (GUM) 7.2.6, which also allows to round it up."""
VALUE_DIGITS = 6
"""No more significant digits than these are written of any other value, however narrow its band."""
EXACT = Context(prec=60)
GRACE = Decimal("1e-6")
"""Part of the last digit by which a band may be rounded down: what binary floats leave of a decimal."""


def rounded(value: float, band: float, finest: int | None = None) -> tuple[str, str]:
    """Return value and band as text: two digits of the band, and the interval written holds the whole interval given.

    Parameters
    ----------
    value, band : float
        Finite, in one unit; band not negative.
    finest : int, optional
        Decimal place below which nothing is written; by default that of the value's sixth digit. A band below it is
        written as one unit of that place, never as nothing.

    Examples
    --------
    >>> rounded(212.3456, 0.781)
    ('212.35', '0.79')
    >>> rounded(1234.5, 127.0)
    ('1230', '140')
    >>> rounded(20.0, 0.0, finest=-3)
    ('20.000', '0.001')
    """
    exact, wide = Decimal(value), Decimal(band)
    if finest is None:
        finest = max(exact, wide, key=abs).adjusted() - VALUE_DIGITS + 1 if exact or wide else 0
    place = max(wide.adjusted() - BAND_DIGITS + 1, finest) if wide else finest
    step = Decimal(1).scaleb(place)
    short = exact.quantize(step, ROUND_HALF_EVEN, EXACT)
    # What rounding moved the value by is added to the band, so that nothing inside it falls out.
    whole = EXACT.add(wide, EXACT.abs(EXACT.subtract(short, exact)))
    up = EXACT.subtract(whole, EXACT.multiply(step, GRACE)).quantize(step, ROUND_CEILING, EXACT)
    return f"{short:f}", f"{max(up, step):f}"


def digits(value: float, count: int) -> str:
    """Return a value with so many significant digits, without an exponent.

    Examples
    --------
    >>> digits(0.012345, 3), digits(123456.0, 3), digits(0.0, 3)
    ('0.0123', '123456', '0')
    """
    if value == 0.0:
        return "0"
    return f"{value:.{max(count - 1 - math.floor(math.log10(abs(value))), 0)}f}"


def plain(value: float) -> str:
    """Return a number that is no result (an input, an instant): five digits, and every one before the point.

    Examples
    --------
    >>> plain(500.0), plain(1234567.8), plain(19.166667), plain(0.1)
    ('500', '1234568', '19.167', '0.1')
    """
    return f"{value:.5g}" if abs(value) < 99999.5 else f"{value:.0f}"


def span(middle: float, low: float, high: float) -> tuple[str, str, str]:
    """Return a value and the ends of its range as text, two digits of the range's width, the ends rounded outwards.

    Examples
    --------
    >>> span(371.94, 366.12, 380.71)
    ('372', '366', '381')
    """
    place = (Decimal(high) - Decimal(low)).adjusted() - BAND_DIGITS + 1
    step = Decimal(1).scaleb(place)
    grace = EXACT.multiply(step, GRACE)
    start = EXACT.add(Decimal(low), grace).quantize(step, ROUND_FLOOR, EXACT)
    end = EXACT.subtract(Decimal(high), grace).quantize(step, ROUND_CEILING, EXACT)
    return f"{Decimal(middle).quantize(step, ROUND_HALF_EVEN, EXACT):f}", f"{start:f}", f"{end:f}"
