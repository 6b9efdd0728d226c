"""The lasso boundary as a curve for drawing: one vectorised pass, no root finding.

The boundary's TPP is explicit in the zero threshold t (see `engine.limits.lasso`), so a grid
in t gives the whole curve. It ends at the power limit, or at TPP 1, to about 1e-4: less than
a pixel. For values, call `lasso_boundary`.
"""

import numpy as np
from scipy.special import ndtr

from engine.limits.transition import near_threshold_at_ratio, near_threshold_at_sparsity
from engine.normal import Array

__all__ = ["lasso_curve"]

# From t = 9 on the false share of the list is below 1e-16 at every sparsity worth drawing.
_LAST_T = 9.0


def lasso_curve(
    sampling_ratio: float, sparsity: float, points: int = 256
) -> tuple[Array, Array]:
    """Return the lasso boundary as (tpp, fdp), from its right end down to (0, 0).

    The arguments are trusted: a sampling ratio above 0 and a sparsity in (0, 1).

    Examples
    --------
    >>> from engine.limits.lasso_curve import lasso_curve
    >>> tpp, fdp = lasso_curve(0.3, 0.2)
    >>> round(float(tpp[0]), 3), round(float(fdp[0]), 3)
    (0.568, 0.622)
    """
    delta, eps = sampling_ratio, sparsity
    low = near_threshold_at_sparsity(eps)
    if delta < 1.0:
        low = max(low, near_threshold_at_ratio(delta))
    steps = np.linspace(0.0, 1.0, points)
    t = low + (_LAST_T - low) * steps * steps
    square = t * t
    bend = np.exp(-0.5 * square) * (t * (2.0 / np.sqrt(2.0 * np.pi)))  # 2 t phi(t)
    tail = ndtr(-t)
    inside = 1.0 - 2.0 * tail
    square += 1.0
    null_risk = 2.0 * square * tail - bend
    tpp = (eps * bend + inside * (delta - (1.0 - eps) * null_risk)) / (
        eps * (square * inside + bend)
    )
    tail *= 2.0 * (1.0 - eps)
    fdp = tail / (tail + eps * tpp)
    return _ended(tpp, fdp)


def _ended(tpp: Array, fdp: Array) -> tuple[Array, Array]:
    """Cut the curve at TPP 1, by interpolation, and lead it to the origin."""
    tpp[-1] = fdp[-1] = 0.0
    beyond = len(tpp) - int(tpp[::-1].searchsorted(1.0, side="right"))
    if beyond:
        left = beyond - 1
        part = (tpp[left] - 1.0) / (tpp[left] - tpp[beyond])
        fdp[:beyond] = fdp[left] + part * (fdp[beyond] - fdp[left])
        tpp[:beyond] = 1.0
    return tpp, fdp
