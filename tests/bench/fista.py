"""The textbook sorted-L1 fit: proximal gradient with momentum and restart on the whole design.

A naive second implementation: its proximal map is the stack algorithm, not the engine's, and it
knows neither working sets nor clusters.
"""

import numpy as np

__all__ = ["fista", "relative_gap", "stack_prox"]

# Products with the design between two looks at the gap, which costs next to nothing then.
_LOOK = 10


def stack_prox(v, weights):
    """Sorted-L1 proximal map: pool from the largest on while a block exceeds the one before."""
    order = np.argsort(-np.abs(v))
    sums, counts = [], []
    for excess in (np.abs(v)[order] - weights).tolist():
        sums.append(excess)
        counts.append(1)
        while len(sums) > 1 and sums[-1] * counts[-2] >= sums[-2] * counts[-1]:
            last, count = sums.pop(), counts.pop()
            sums[-1] += last
            counts[-1] += count
    means = np.repeat(np.maximum(np.array(sums) / counts, 0.0), counts)
    result = np.empty_like(v)
    result[order] = means
    return np.sign(v) * result


def relative_gap(X, y, b, weights):
    """Duality gap over half the squared length of y, from the definition."""
    r = y - X @ b
    g = np.sort(np.abs(X.T @ r))[::-1]
    a = (np.cumsum(weights) / np.cumsum(g)).min()
    theta = np.clip(y @ r / (r @ r), -a, a) * r
    primal = 0.5 * r @ r + weights @ np.sort(np.abs(b))[::-1]
    dual = 0.5 * y @ y - 0.5 * (y - theta) @ (y - theta)
    return (primal - dual) / (0.5 * y @ y)


def fista(X, y, weights, gap, start=None, prox=stack_prox, most=20_000):
    """Return the fit at a relative duality gap, or after `most` steps."""
    step = 1.0 / np.linalg.norm(X, 2) ** 2 if start is None else start[1]
    x = z = np.zeros(X.shape[1]) if start is None else start[0]
    momentum = 1.0
    for count in range(1, most + 1):
        new = prox(z + step * (X.T @ (y - X @ z)), step * weights)
        if (z - new) @ (new - x) > 0.0:
            momentum = 1.0
        following = 0.5 * (1.0 + np.sqrt(1.0 + 4.0 * momentum**2))
        z = new + (momentum - 1.0) / following * (new - x)
        x, momentum = new, following
        if count % _LOOK == 0 and relative_gap(X, y, x, weights) <= gap:
            break
    return x
