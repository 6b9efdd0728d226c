r"""How far a fit can be from the optimum at most: the duality gap of sorted L1.

With r = y - X b and g = X'r, the point theta = s r is dual feasible where
|s| <= a = min_k (lambda_1 + ... + lambda_k) / (|g|_(1) + ... + |g|_(k)); the best s there is
y'r / r'r clipped to [-a, a]. The dual value is D = 1/2 ||y||^2 - 1/2 ||y - theta||^2, and
(primal - D) / (1/2 ||y||^2) the relative gap (standard duality, checked by a generic solver).
"""

import numpy as np

from engine.fit.prox import Indices, prox
from engine.normal import Array

__all__ = ["least_empty_scale", "relative_gap", "sorted_penalty", "unsettled"]

# Steps of the proximal gradient whose supports must agree; they differ by a factor of ten.
_STEPS = (0.3, 1.0, 3.0)


def sorted_penalty(b: Array, weights: Array) -> float:
    """Sum of the weights times the sorted magnitudes of b."""
    sizes = np.abs(b)
    if weights[0] != weights[-1]:
        return float(weights @ -np.sort(-sizes))
    return float(weights[0] * sizes.sum())


def least_empty_scale(g: Array, weights: Array) -> float:
    """Return 1/a: the factor on the weights from which on they outweigh g."""
    sizes = np.abs(g)
    if weights[0] == weights[-1]:
        return float(sizes.max() / weights[0])
    return float(np.max(np.cumsum(-np.sort(-sizes)) / np.cumsum(weights)))


def relative_gap(
    y_y: float, y_r: float, r_r: float, penalty: float, g: Array, weights: Array
) -> float:
    """Return the relative gap from ||y||^2, y'r, ||r||^2, the penalty and g = X'r."""
    if r_r <= 0.0 or y_y <= 0.0:
        return 2.0 * penalty / y_y if y_y > 0.0 else 0.0
    excess = least_empty_scale(g, weights)
    a = 1.0 / excess if excess > 0.0 else np.inf
    s = float(np.clip(y_r / r_r, -a, a))
    primal = 0.5 * r_r + penalty
    dual = s * y_r - 0.5 * s * s * r_r
    return max(0.0, (primal - dual) / (0.5 * y_y))


def unsettled(b: Array, g: Array, weights: Array) -> Indices:
    """Positions at which some proximal gradient step turns a zero nonzero, or back.

    At the optimum every step prox_{t lambda}(b + t g) gives b again. Near it, an entry whose
    being zero is not settled changes sides for a small or a large t.
    """
    zero = b == 0.0
    changed = np.zeros(b.size, dtype=bool)
    for t in _STEPS:
        changed |= (prox(b + t * g, t * weights) == 0.0) != zero
    return np.flatnonzero(changed)
