"""The standard normal law and the moments of soft thresholding, in closed form.

phi, Phi: density and distribution function; Z ~ N(0, 1); s(x; a) = sign(x) max(|x| - a, 0).
The formulas are textbook integrals of the normal law, written from memory; tests verify each
one by quadrature.
"""

import numpy as np
import numpy.typing as npt
from scipy.special import erf, erfcx, ndtr

__all__ = [
    "Array",
    "central",
    "density",
    "mills",
    "null_risk",
    "selection",
    "soft_risk",
    "tail",
]

Array = npt.NDArray[np.float64]

_SQRT2 = float(np.sqrt(2.0))
_SQRT_2PI = float(np.sqrt(2.0 * np.pi))
_SQRT_HALF_PI = float(np.sqrt(np.pi / 2.0))


def density(x: Array) -> Array:
    """Density phi(x)."""
    return np.exp(-0.5 * x * x) / _SQRT_2PI


def tail(x: Array) -> Array:
    """Upper tail Phi(-x), accurate for large x."""
    return ndtr(-x)  # type: ignore[no-any-return]


def central(x: Array) -> Array:
    """P(|Z| <= x) = 2 Phi(x) - 1, accurate for small x."""
    return erf(x / _SQRT2)  # type: ignore[no-any-return]


def mills(x: Array) -> Array:
    """Mills ratio Phi(-x) / phi(x), finite and accurate for all x >= 0."""
    return _SQRT_HALF_PI * erfcx(x / _SQRT2)  # type: ignore[no-any-return]


def null_risk(a: Array) -> Array:
    """E s(Z; a)^2 = 2 [(1 + a^2) Phi(-a) - a phi(a)], for a >= 0."""
    # The bracket cancels from a of about 1e4 on, where phi is 0 already.
    return 2.0 * density(a) * np.maximum((1.0 + a * a) * mills(a) - a, 0.0)


def selection(m: Array, a: Array) -> Array:
    """P(|m + Z| > a), for a >= 0."""
    return tail(a - m) + tail(a + m)


def soft_risk(m: Array, a: Array) -> Array:
    """E [s(m + Z; a) - m]^2, for a >= 0 and finite m; its limit at infinite m is 1 + a^2."""
    inside = tail(-a - m) - tail(a - m)  # P(|m + Z| <= a)
    return (
        m * m * inside
        + (1.0 + a * a) * selection(m, a)
        - (a + m) * density(a - m)
        - (a - m) * density(a + m)
    )
