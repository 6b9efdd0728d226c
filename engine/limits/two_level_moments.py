r"""Moments of the two-level shrinkage, in closed form.

A two-level penalty, with levels a >= b and the larger level on some share of the ranks, acts on
an estimate x in units of tau through the odd function

    eta(x) = 0 up to b,   x - b up to b + h,   h up to a + h,   x - a beyond     (x >= 0),

where h >= 0 is set by the share (*Sharp trade-offs in high-dimensional inference via 2-level
SLOPE*, arXiv 2507.09110, 2025; from memory, verified by quadrature in the tests). Every moment
is a sum of truncated normal moments over the pieces, one side of 0 at a time.
"""

import math
from dataclasses import dataclass

import numpy as np

from engine.limits.witness import Law
from engine.normal import Array, density, tail

__all__ = ["Pieces", "null_risk_and_slope", "risk_and_slope", "selected"]


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


@dataclass(frozen=True)
class Pieces:
    """One two-level shrinkage: lower level b, gap to the upper one, height of the flat stretch.

    An infinite height belongs to a law whose largest effects outgrow tau: the stretch then lies
    where they are, so that t + Z is shrunk to min(t + Z - b, t).
    """

    b: float
    gap: float
    h: float

    def risk_and_slope_of(self, law: Law, sparsity: float) -> tuple[float, float]:
        """Return risk and E eta' of a law of the actives, the nulls included."""
        parts = [(1.0 - sparsity, self._at(0.0))] + [
            (sparsity * share, self._at(size))
            for size, share in zip(law.sizes, law.shares, strict=True)
        ]
        return (
            math.fsum(mass * moments[0] for mass, moments in parts),
            math.fsum(mass * moments[1] for mass, moments in parts),
        )

    def level_share(self, law: Law, sparsity: float) -> float:
        """Share of the ranks that has to have the upper level for this shrinkage to come about.

        Over the flat stretch the mean of the weights equals the mean of |x| - h.
        """
        if self.gap == 0.0:
            return 1.0
        masses = [1.0 - sparsity, *(sparsity * share for share in law.shares)]
        total = 0.0
        for size, mass in zip((0.0, *law.sizes), masses, strict=True):
            for start in self._flats(size):
                if start == -math.inf:  # beyond both levels for sure
                    total += mass
                    continue
                end = start + self.gap
                # int (|x| - h - b) over the stretch; |x| - h - b is Z - start there
                pooled = _density(start) - _density(end) - start * (_tail(start) - _tail(end))
                total += mass * (pooled / self.gap + _tail(end))
        return min(total, 1.0)

    def _at(self, size: float) -> tuple[float, float]:
        """Risk and slope of one size, in the limit where it or the height is infinite."""
        a, b = self.b + self.gap, self.b
        if math.isinf(size) and math.isinf(self.h):
            return (1.0 + b * b) * _tail(-b) + b * _density(b), _tail(-b)
        if math.isinf(size):
            return 1.0 + a * a, 1.0
        # With an infinite height all finite sizes stay below the flat stretch.
        args = (np.asarray(value) for value in (size, b, self.gap, min(self.h, size + 40.0)))
        risk, slope = risk_and_slope(*args)
        return float(risk), float(slope)

    def _flats(self, size: float) -> tuple[float, ...]:
        """Where Z enters the flat stretch, on either side; empty where it never does."""
        if math.isinf(size):
            return (self.b,) if math.isinf(self.h) else (-math.inf,)
        if math.isinf(self.h):
            return ()
        return (self.b + self.h - size, self.b + self.h + size)


def _tail(x: float) -> float:
    return 0.5 * math.erfc(x / math.sqrt(2.0))


def _density(x: float) -> float:
    return math.exp(-0.5 * x * x) / math.sqrt(2.0 * math.pi)
