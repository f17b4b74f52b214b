"""How far a printed number may lie from the number that was rounded."""

from __future__ import annotations


def half_unit(value: float) -> float:
    """Half a unit of the last digit of ``value`` as it would be printed.

    Examples
    --------
    >>> half_unit(0.25)
    0.005
    """
    mantissa, _, exponent = repr(float(value)).partition("e")
    decimals = len(mantissa.partition(".")[2].rstrip("0")) - int(exponent or 0)
    return float(0.5 * 10.0 ** -max(min(decimals, 300), -300))
