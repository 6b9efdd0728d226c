r"""The least risk of any sorted-L1 shrinkage, for a law of effects and a zero threshold.

*Derived here* from the lower bound posed in *Characterizing the SLOPE trade-off*, Annals of
Statistics 51(1), 2023, doi 10.1214/22-AOS2194; tests verify it against a generic quadratic
program. In units of tau an estimate is pi + Z, with pi = t_j for the share p_j of the
candidates and pi = 0 for the rest. The shrinkages that a sorted-L1 penalty can have in the
limit are the odd functions eta that are 0 up to the zero threshold alpha and rise with a slope
in [0, 1] beyond. With x = |pi + Z|,

    w(x) = 2 (1 - sum_j p_j) phi(x) + sum_j p_j [phi(x - t_j) + phi(x + t_j)],
    m(x) = sum_j p_j t_j [phi(x - t_j) - phi(x + t_j)] / w(x),

and eta(x) = x - A(x), the risk is

    sum_j p_j t_j^2 - int_alpha w m^2 dx + int_alpha w (A - (x - m))^2 dx,

so the best A is the nondecreasing regression of x - m(x) with weights w(x), raised to alpha
where it is lower. Its slope stays within [0, 1] by itself, because the posterior mean m rises.
"""

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from scipy.optimize import isotonic_regression

from engine.normal import Array

__all__ = ["Folded", "Shrinkage", "fold", "least_risk"]

# The integrand has a jump in its second derivative where a pooled stretch ends, so the error
# falls with the cube of the spacing whatever the rule, and even spacing keeps it smallest:
# about 1e-7, or 1e-7 of the risk in sparse studies, whose steepest boundaries turn that into
# 3e-6 of FDP.
_STEP = 0.0125

# Weights of the first nodes in units of the step (Gregory's rule); all others are 1.
_END = np.array([3.0 / 8.0, 7.0 / 6.0, 23.0 / 24.0])

# The density beyond the last node, 8 standard deviations past every atom, is below 1e-14.
_REACH = 8.0

# Keeps the weights positive far from every atom, where they underflow.
_FLOOR = 1e-250

_SQRT_2PI = float(np.sqrt(2.0 * np.pi))


class Shrinkage(NamedTuple):
    """The best shrinkage eta(x) = x - withheld(x) past the threshold, on nodes.

    Attributes
    ----------
    threshold : float
        alpha, up to which eta is 0.
    risk : float
        E (eta(pi + Z) - pi)^2.
    energy : float
        E pi^2.
    x, mass, withheld : ndarray, shape (nodes,)
        Nodes past the threshold, the share of the candidates each stands for, and A there.
    """

    threshold: float
    risk: float
    energy: float
    x: Array
    mass: Array
    withheld: Array

    @property
    def slope(self) -> float:
        """E eta', without differentiating across kinks.

        Stein's identity makes it (risk + 1 - E A^2) / 2, with A = x up to the threshold.
        """
        beyond = float(self.mass @ (self.x**2 - self.withheld**2))  # E x^2 = 1 + E pi^2
        return 0.5 * (self.risk - self.energy + beyond)


def least_risk(threshold: float, sizes: Sequence[float], masses: Sequence[float]) -> Shrinkage:
    """Return the sorted-L1 shrinkage of least risk for a law with finite atoms.

    The arguments are trusted.

    Parameters
    ----------
    threshold : float
        Zero threshold alpha >= 0, in units of tau.
    sizes, masses : sequence of float
        Effects t_j >= 0 in units of tau, and the share p_j of the candidates at each. The
        other candidates have no effect.

    Examples
    --------
    >>> from engine.limits.least_risk import least_risk
    >>> round(least_risk(1.0, (1.4,), (0.2,)).risk, 4)
    0.286
    """
    folded = fold(threshold, sizes, masses)
    aim = folded.x - folded.mean
    pooled = isotonic_regression(aim, weights=folded.mass).x
    return folded.shrinkage(np.maximum(pooled, threshold))


class Folded(NamedTuple):
    """|pi + Z| past a threshold: nodes, the candidates each stands for, posterior means.

    `energy` is E pi^2, of all candidates.
    """

    threshold: float
    energy: float
    x: Array
    mass: Array
    mean: Array

    @property
    def past(self) -> Array:
        """P(|pi + Z| > x) at the nodes: the trapezium rule and its first correction."""
        plain = self.mass.copy()
        plain[: _END.size] /= _END
        rising = np.gradient(plain) / 12.0
        sums: Array = np.cumsum(plain[::-1])[::-1] - 0.5 * plain + rising
        return np.maximum(sums, 0.0)

    def shrinkage(self, withheld: Array) -> Shrinkage:
        """Return the shrinkage x - `withheld` with its risk."""
        excess = withheld - (self.x - self.mean)
        risk = self.energy + float(self.mass @ (excess * excess - self.mean * self.mean))
        return Shrinkage(self.threshold, risk, self.energy, self.x, self.mass, withheld)


def fold(threshold: float, sizes: Sequence[float], masses: Sequence[float]) -> Folded:
    """Return |pi + Z| past the threshold for a law with finite atoms.

    Examples
    --------
    >>> from engine.limits.least_risk import fold
    >>> round(float(fold(0.0, (1.4,), (0.2,)).mass.sum()), 6)
    1.0
    """
    offsets, widths = _nodes(max(max(sizes) - threshold, 0.0))
    x = threshold + offsets
    # Densities here lack their factor 1 / sqrt(2 pi), which is in the widths.
    w = (2.0 * (1.0 - sum(masses))) * np.exp(-0.5 * x * x) + _FLOOR
    first: Array | float = 0.0  # w m
    energy = 0.0
    for t, p in zip(sizes, masses, strict=True):
        away = x - t
        plus = p * np.exp(-0.5 * away * away)
        minus = plus * np.exp((-2.0 * t) * x)
        w += plus + minus
        first = first + t * (plus - minus)
        energy += p * t * t
    return Folded(threshold, energy, x, w * widths, first / w)


def _nodes(stretch: float) -> tuple[Array, Array]:
    """Offsets from the threshold and their widths, up to `_REACH` past an atom at `stretch`."""
    return _evenly(int(np.ceil(stretch + _REACH)))


@lru_cache(maxsize=64)
def _evenly(length: int) -> tuple[Array, Array]:
    count = int(length / _STEP)
    offsets = _STEP * np.arange(count, dtype=np.float64)
    widths = np.full(count, _STEP / _SQRT_2PI)
    widths[: _END.size] *= _END
    offsets.flags.writeable = widths.flags.writeable = False
    return offsets, widths
