r"""The polar law: some actives outgrow tau, all others tend to 0.

*Derived here*, verified by tests. With b the level that the shrinkage withholds near 0, x the
share of the candidates that outgrow tau, and phi, Phi the normal density and law, the least
risk of any sorted-L1 shrinkage is

    R(b, x) = (1 - x) null_risk(b) + x [(1 + b^2) Phi(b) + b phi(b)],

since a large effect t + Z is shrunk to min(t + Z - b, t). At zero threshold alpha the level is
alpha, or, where it is larger, the c(x) at which R is stationary,

    2 (1 - x) [phi(c) - c Phi(-c)] = x [c Phi(c) + phi(c)];

then estimates between alpha and c come out arbitrarily small. With eps the sparsity, u the TPP
and x = eps l, the zero threshold follows from u = l + (1 - l) 2 Phi(-alpha).
"""

import numpy as np
from scipy.optimize import elementwise
from scipy.special import ndtri

from engine.normal import Array, density, mills, null_risk, tail

__all__ = [
    "level_of",
    "polar_risk",
    "polar_share",
    "polar_threshold",
    "risk_at",
    "saturated_threshold",
]


def polar_threshold(u: Array, delta: Array, eps: Array) -> Array:
    """The largest zero threshold with risk delta at level alpha; nan where there is none."""
    bottom = _least_polar(u, eps)
    has_root = polar_risk(bottom, u, eps) < delta
    top = np.maximum(bottom, np.sqrt(2.0 * delta / (eps * u))) + 2.0
    root: Array = elementwise.find_root(
        lambda b, u, delta, eps: polar_risk(b, u, eps) - delta,
        (np.where(has_root, bottom, 0.0), np.where(has_root, top, 1.0)),
        args=(u, delta, eps),
    ).x
    return np.where(has_root, root, np.nan)


def polar_risk(b: Array, u: Array, eps: Array) -> Array:
    """Risk at level b = alpha."""
    return risk_at(b, eps * polar_share(b, u))


def risk_at(b: Array, x: Array) -> Array:
    """R(b, x)."""
    return (1.0 - x) * null_risk(b) + x * _large_risk(b)


def polar_share(alpha: Array, u: Array) -> Array:
    """Share l of the actives that outgrows tau at zero threshold alpha."""
    chance = 2.0 * tail(alpha)
    return np.clip((u - chance) / np.maximum(1.0 - chance, 1e-300), 0.0, 1.0)


def saturated_threshold(u: Array, delta: Array, eps: Array) -> Array:
    """The zero threshold with risk delta at a level above it; nan where there is none."""
    level, x = saturated(delta)
    partial = (x < eps * u) & (delta < _RISKS[0])
    gap = np.where(partial, eps - x, 1.0)
    alpha = -ndtri(0.5 * np.where(partial, (eps * u - x) / gap, 1.0))
    return np.where(partial & (alpha <= level), alpha, np.nan)


def level_of(alpha: Array, x: Array, delta: Array) -> Array:
    """Level of the shrinkage at a zero threshold where the polar law has risk delta."""
    at_alpha = risk_at(alpha, x) <= delta * (1.0 + 1e-9)
    return np.where(at_alpha, alpha, np.maximum(alpha, saturated(delta)[0]))


def saturated(delta: Array) -> tuple[Array, Array]:
    """The level c and the share x at which R is stationary in c and equal to delta.

    From the largest such R on, a delta of about 0.698, both are those of that largest R.
    """
    c = np.interp(-delta, -_RISKS, _LEVELS)
    for _ in range(2):  # the error squares: 1e-5, 1e-10, rounding
        x, slope = _share_at(c)
        excess = risk_at(c, x) - delta
        # R is stationary in c, so that it changes with x alone.
        change = slope * (_large_risk(c) - null_risk(c))
        c = np.where(delta < _RISKS[0], c - excess / change, c)
    return c, _share_at(c)[0]


def _large_risk(b: Array) -> Array:
    return (1.0 + b * b) * tail(-b) + b * density(b)


def _share_at(c: Array) -> tuple[Array, Array]:
    """The share x at which R is stationary in c, and its slope."""
    near = 2.0 * density(c) * (1.0 - c * mills(c))
    far = c * tail(-c) + density(c)
    slope = -(2.0 * tail(c) * far + near * tail(-c)) / (near + far) ** 2
    return near / (near + far), slope


def _least_polar(u: Array, eps: Array) -> Array:
    """Where the polar risk is least, by golden section from the threshold of random picks."""
    ratio = 0.6180339887498949
    low = -ndtri(0.5 * u)
    high = low + 12.0  # nulls are below 1e-32 there: the risk has long been rising
    for _ in range(36):  # 12 * 0.618^36 < 1e-6
        left, right = high - ratio * (high - low), low + ratio * (high - low)
        keep = polar_risk(left, u, eps) <= polar_risk(right, u, eps)
        low, high = np.where(keep, low, left), np.where(keep, right, high)
    middle: Array = 0.5 * (low + high)
    return middle


def _saturated_table() -> tuple[Array, Array]:
    """Levels from the one of largest stationary R on, and R there, falling."""
    c = np.linspace(0.2, 38.0, 8000)
    risk = risk_at(c, _share_at(c)[0])
    start = int(np.argmax(risk))
    return c[start:], risk[start:]


_LEVELS, _RISKS = _saturated_table()
