"""Weights given rank by rank: the shrinkage that their proximal operator has in the limit.

The population prox is the isotonic regression of x - (weight at the rank of x), cut off at 0
(*Algorithmic analysis and statistical estimation of SLOPE via AMP*, IEEE Trans. Inf. Theory 67,
2021), on nodes in x that start at the zero threshold alpha. There the regression passes through
0, so that the strength follows at once: c = alpha / w(rank of alpha) (*derived here*). This
holds when the regression does not pool across alpha; where it does no strength has this
threshold, and the path jumps over it.
"""

from collections.abc import Callable

import numpy as np
from scipy.optimize import isotonic_regression

from engine.limits.least_risk import Folded, fold
from engine.normal import Array
from engine.penalties.penalty import Law, RankedWeights, Shape

__all__ = ["profile_shape"]

# Pooled means this close to 0, in units of tau, are 0 up to the spacing of the nodes.
_SLACK = 1e-3
_LEFT = np.linspace(1.0, 0.0, 80, endpoint=False)  # nodes from alpha down


def profile_shape(
    threshold: float,
    law: Law,
    profile: Callable[[Array], Array],
    finite: RankedWeights,
    ramp_level: float | None = None,
    folded: Folded | None = None,
) -> Shape:
    """Return the shrinkage with a zero threshold of weights proportional to a profile.

    Parameters
    ----------
    profile : callable
        Weight at the ranks that stand the shares r in (0, 1) from the top; nonincreasing.
    finite : callable
        The same weights at ranks of p candidates.
    folded : Folded, optional
        |pi + Z| past the threshold, where it is known already.
    """
    folded = folded or fold(threshold, law.sizes.tolist(), law.masses.tolist())
    past = folded.past
    unit = float(profile(past[:1])[0])
    strength = threshold / unit if unit > 0.0 else np.inf
    if not np.isfinite(strength):
        return Shape(np.inf, 1.0, finite, admissible=False)
    raw = isotonic_regression(folded.x - strength * profile(past), weights=folded.mass).x
    shrinkage = folded.shrinkage(folded.x - np.maximum(raw, 0.0))
    return Shape(
        shrinkage.risk,
        shrinkage.slope,
        lambda ranks, p: strength * finite(ranks, p),
        raw[0] >= -_SLACK and _apart(threshold, law, profile, strength),
        ramp_level=ramp_level,
    )


def _apart(
    threshold: float, law: Law, profile: Callable[[Array], Array], strength: float
) -> bool:
    """Whether the regression below the threshold stays below 0 up to it.

    It does when every stretch that ends at the threshold has a mean of at most 0.
    """
    if threshold == 0.0:
        return True
    x = threshold * _LEFT
    past = law.beyond(x)
    mass = np.diff(past, prepend=past[0])
    means = np.cumsum(mass * (x - strength * profile(past)))
    return bool((means <= _SLACK * np.cumsum(mass) + 1e-15).all())
