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


def significant_digits(value: float) -> int:
    """Digits of ``value`` as it would be printed, zeros at both ends apart.

    Examples
    --------
    >>> significant_digits(0.0120)
    2
    >>> significant_digits(1200.0)
    2
    """
    mantissa = repr(abs(float(value))).partition("e")[0]
    return len(mantissa.replace(".", "").strip("0"))
