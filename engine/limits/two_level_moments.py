r"""Moments of the two-level shrinkage, in closed form.

A two-level penalty, with levels a >= b and the larger level on some share of the ranks, acts on
an estimate x in units of tau through the odd function

    eta(x) = 0 up to b,   x - b up to b + h,   h up to a + h,   x - a beyond     (x >= 0),

where h >= 0 is set by the share (*Sharp trade-offs in high-dimensional inference via 2-level
SLOPE*, arXiv 2507.09110, 2025; from memory, verified by quadrature in the tests). Every moment
is a sum of truncated normal moments over the pieces, one side of 0 at a time.
"""

import numpy as np

from engine.normal import Array, density, tail

__all__ = ["risk_and_slope", "selected"]


def risk_and_slope(t: Array, b: Array, gap: Array, h: Array) -> tuple[Array, Array]:
    """Return E [eta(t + Z) - t]^2 and E eta'(t + Z), elementwise, with gap = a - b."""
    right = _side(t, b, gap, h)
    left = _side(-t, b, gap, h)
    inside = tail(t - b) - tail(t + b)  # P(|t + Z| <= b)
    return t * t * inside + right[0] + left[0], right[1] + left[1]


def null_risk_and_slope(b: Array, gap: Array, h: Array) -> tuple[Array, Array]:
    """The same at t = 0, for half the work."""
    risk, slope = _side(np.zeros(()), b, gap, h)
    return 2.0 * risk, 2.0 * slope


def selected(t: Array, b: Array) -> Array:
    """P(|t + Z| > b)."""
    return tail(b - t) + tail(b + t)


def _side(t: Array, b: Array, gap: Array, h: Array) -> tuple[Array, Array]:
    """The share of both moments from x > b; with -t for t, that from x < -b."""
    start = b - t
    flat = start + h
    end = flat + gap
    tail_start, tail_flat, tail_end = tail(start), tail(flat), tail(end)
    a = b + gap
    # int_z^inf (y - s)^2 phi(y) dy = (1 + s^2) Phi(-z) + (z - 2 s) phi(z)
    risk = (
        (1.0 + b * b) * (tail_start - tail_flat)
        + (start - 2.0 * b) * density(start)
        - (flat - 2.0 * b) * density(flat)
        + (h - t) ** 2 * (tail_flat - tail_end)
        + (1.0 + a * a) * tail_end
        + (end - 2.0 * a) * density(end)
    )
    return risk, tail_start - tail_flat + tail_end
