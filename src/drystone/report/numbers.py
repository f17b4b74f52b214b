"""Numbers as people read them: percent with sign, few digits, no dash between limits."""

from __future__ import annotations

import math

NOT_KNOWN = "n/a"
MINUS = "\N{MINUS SIGN}"
FIXED_SPACE = "\N{NO-BREAK SPACE}"
THIN_SPACE = "\N{NARROW NO-BREAK SPACE}"
LARGEST_PERCENT = 1e6


def as_percent(log_ratio: float) -> float:
    """Percent change of a median ratio, 100 (exp(x) - 1); inf where exp overflows."""
    try:
        return 100.0 * math.expm1(log_ratio)
    except OverflowError:
        return math.inf


def percent(log_ratio: float) -> str:
    """Percent change with sign, for example '+12 %'."""
    return f"{percent_bare(log_ratio)}{FIXED_SPACE}%" if _known(log_ratio) else NOT_KNOWN


def percent_bare(log_ratio: float) -> str:
    """Percent change with sign but without the percent mark."""
    if not _known(log_ratio):
        return NOT_KNOWN
    value = as_percent(log_ratio)
    return _with_plus(_fixed(value, _digits_alone(value)), value)


def percent_interval(low: float, high: float) -> str:
    """Two percent changes, for example '4 to 21'; signs only where negative.

    A limit that is not zero never prints as zero: it would hide on which side it lies. A ratio
    above nothing never prints as -100.
    """
    if not (_known(low) and _known(high)):
        return NOT_KNOWN
    ends = as_percent(low), as_percent(high)
    digits = _digits_of_width(ends[1] - ends[0])
    return " to ".join(_fixed(end, _until_honest(end, digits)) for end in ends)


def percent_with_interval(estimate: float, low: float, high: float) -> str:
    """Estimate and limits as percent changes, for example '+12 % (4 to 21)'."""
    if not _known(estimate):
        return NOT_KNOWN
    ends = as_percent(low), as_percent(high)
    value = as_percent(estimate)
    if not (_known(low) and _known(high)):
        return percent(estimate)
    digits = _digits_of_width(ends[1] - ends[0])
    middle = _with_plus(_fixed(value, _until_honest(value, digits)), value)
    return f"{middle}{FIXED_SPACE}% ({percent_interval(low, high)})"


def number(value: float, digits: int = 3) -> str:
    """Value with ``digits`` significant digits, never in exponent form below a million."""
    if not _known(value):
        return NOT_KNOWN
    if value == 0:
        return "0"
    if math.isinf(value):
        return "infinite" if value > 0 else f"{MINUS}infinite"
    size = math.floor(math.log10(abs(value)))
    if size < -6 or size > 8:
        return f"{value:.{digits - 1}e}".replace("-", MINUS)
    return _fixed(value, max(0, digits - 1 - size))


def amount(value: float) -> str:
    """Number of things: without decimals when it is whole, else with three digits."""
    return whole(value) if _known(value) and value == round(value) else number(value)


def number_interval(low: float, high: float, digits: int = 3) -> str:
    """Two numbers, for example '0.04 to 0.19'."""
    if not (_known(low) and _known(high)):
        return NOT_KNOWN
    return f"{number(low, digits)} to {number(high, digits)}"


def below(value: float, limit: float, digits: int = 3) -> str:
    """A number below ``limit`` with as many digits as it takes not to print as the limit."""
    text = number(value, digits)
    while digits < 9 and text == number(limit, digits):
        digits += 1
        text = number(value, digits)
    return text


def p_value(value: float) -> str:
    """P value with two digits, or '< 0.001'."""
    if not _known(value):
        return NOT_KNOWN
    return "< 0.001" if value < 0.001 else number(value, 2)


def share(value: float) -> str:
    """Share between 0 and 1 as a percentage without sign, for example '31 %'.

    Only all prints as '100 %' and only nothing as '0 %'.
    """
    if not _known(value):
        return NOT_KNOWN
    shown = 100 * value
    if 99.5 <= shown < 100:
        return f"> 99{FIXED_SPACE}%"
    if 0 < shown < 0.05:
        return f"< 0.1{FIXED_SPACE}%"
    return f"{_fixed(shown, 1 if 0 < shown < 9.95 else 0)}{FIXED_SPACE}%"


def level_percent(confidence_percent: float) -> str:
    """Confidence level, for example '95 %'."""
    return f"{confidence_percent:g}{FIXED_SPACE}%"


def whole(value: float) -> str:
    """Whole number with thin spaces between thousands."""
    return _fixed(value, 0) if _known(value) else NOT_KNOWN


def count(number_of: int, one: str, many: str = "") -> str:
    """Count with its noun, for example '1 row' and '12 rows'."""
    noun = one if number_of == 1 else (many or one + "s")
    return f"{whole(number_of)}{FIXED_SPACE}{noun}"


def typed(value: object) -> str:
    """Cell of a table as text: blank when missing, numbers without needless digits."""
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    if isinstance(value, float):
        return f"{value:.6g}".replace("-", MINUS)
    return str(value)


def _known(value: float) -> bool:
    return value is not None and not math.isnan(value)


def _fixed(value: float, digits: int) -> str:
    if value > LARGEST_PERCENT * 1000 or math.isinf(value):
        return f"more than {_fixed(LARGEST_PERCENT * 1000, 0)}" if value > 0 else f"{MINUS}inf"
    text = f"{abs(value):,.{digits}f}".replace(",", THIN_SPACE)
    is_zero = not any(c in "123456789" for c in text)
    return text if value >= 0 or is_zero else MINUS + text


def _with_plus(text: str, value: float) -> str:
    is_zero = not any(c in "123456789" for c in text)
    return f"+{text}" if value > 0 and text[0].isdigit() and not is_zero else text


def _digits_alone(value: float) -> int:
    if value == 0:
        return 0
    size = abs(value)
    return 0 if size >= 9.95 else 1 if size >= 0.995 else 2


def _digits_of_width(width: float) -> int:
    return 0 if width >= 10 or width != width else 1 if width >= 1 else 2 if width >= 0.1 else 3


def _until_honest(value: float, digits: int) -> int:
    while digits < 6 and any(value != no and round(value, digits) == no for no in (0.0, -100.0)):
        digits += 1
    return digits
