"""One-dimensional searches on plain floats: the inner loops of the searched boundaries.

scipy's own are as good but cost more in overhead than the functions searched here.
"""

from collections.abc import Callable

__all__ = ["least_on", "rising_root"]


def rising_root(
    f: Callable[[float], float], start: float, f_start: float, step: float, accuracy: float
) -> float:
    """Return the root above `start` of a rising function, known to be negative there.

    Secant steps through the last two points; a step that leaves the interval in which the
    sign changes is replaced by its middle, one that goes too far up before that interval is
    known by a fourfold stride.

    Parameters
    ----------
    f : callable
        Rising, with f(start) = `f_start` < 0.
    step : float
        First stride.
    accuracy : float
        Ends the search: the last secant step is shorter.
    """
    low, high = start, float("inf")
    before, f_before = start, f_start
    x = start + step
    for _ in range(60):
        value = f(x)
        low, high = (x, high) if value < 0.0 else (low, min(x, high))
        slope = (value - f_before) / (x - before)
        following = x - value / slope if slope > 0.0 else x + 2.0 * step
        if abs(following - x) < accuracy:
            return following
        if not low < following < high:
            following = 0.5 * (low + high) if high < float("inf") else low + step
        elif high == float("inf"):
            following = min(following, low + 4.0 * step)
        before, f_before, step = x, value, abs(following - x)
        x = following
    return x


def least_on(
    f: Callable[[float], float], low: float, high: float, accuracy: float
) -> tuple[float, float]:
    """Return the (argument, value) of a minimum of `f` between two ends, by golden section."""
    ratio = 0.6180339887498949
    a, b = high - ratio * (high - low), low + ratio * (high - low)
    f_a, f_b = f(a), f(b)
    while high - low > accuracy:
        if f_a <= f_b:
            high, b, f_b = b, a, f_a
            a = high - ratio * (high - low)
            f_a = f(a)
        else:
            low, a, f_a = a, b, f_b
            b = low + ratio * (high - low)
            f_b = f(b)
    return (a, f_a) if f_a <= f_b else (b, f_b)
