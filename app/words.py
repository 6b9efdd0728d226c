"""Numbers as the screen shows them.

TPP and FDP: two digits as typed, three computed. Ratios: three. Counts: whole, in groups.
A value that is not exactly 0 or 1 is never shown as 0 or 1; a value that does not exist is
'none'.
"""

import math

from engine.limits.families import FAMILIES

__all__ = ["NONE", "computed", "count", "ratio", "short_name", "significant", "typed"]

NONE = "none"
_GROUP = "\u202f"  # narrow no-break space


def count(value: float) -> str:
    """Return a count, rounded, with its thousands apart; '<1' for less than a half of one."""
    if 0.0 < value < 0.5:
        return "<1"
    return f"{round(value):,}".replace(",", _GROUP).replace("-", "−")


def computed(value: float, digits: int = 3) -> str:
    """Return a computed share (TPP, FDP or a limit of them)."""
    if math.isnan(value):
        return NONE
    least = 10.0**-digits
    text = f"{value:.{digits}f}"
    if value > 0.0 and float(text) == 0.0:
        return f"<{least:.{digits}f}"
    if value < 1.0 and float(text) == 1.0:
        return f">{1.0 - least:.{digits}f}"
    return text


def typed(value: float) -> str:
    """Return a share that the user gave: two digits, more only where they typed more."""
    text = f"{value:.4f}".rstrip("0")
    head, _, tail = text.partition(".")
    if float(text) != value:
        return computed(value, 4)
    return f"{head}.{tail:<02}".replace(" ", "0")


def ratio(value: float) -> str:
    """Return a sampling ratio or a sparsity: three decimals, more only below 0.01."""
    return f"{value:.3f}" if value >= 0.01 else significant(value)


def significant(value: float) -> str:
    """Return three significant digits without an exponent where that stays readable."""
    if value == 0.0 or 1e-4 <= abs(value) < 1e5:
        digits = 2 if value == 0.0 else max(0, 2 - math.floor(math.log10(abs(value))))
        return f"{value:.{digits}f}"
    return f"{value:.2e}"


def short_name(penalty: str) -> str:
    """Return a penalty's name where room is short: beside the others that says enough."""
    return FAMILIES[penalty].label.rpartition(", ")[2]
