"""The witness of the sorted-L1 boundary: its law of effects and its penalty, point by point."""

import math
from collections.abc import Callable
from typing import Any, NamedTuple

import numpy as np
from scipy.special import ndtr, ndtri

from engine.limits.least_risk import least_risk
from engine.limits.polar import level_of, risk_at
from engine.limits.sorted_l1 import Optimum, optima
from engine.limits.witness import Law, Witness
from engine.normal import Array, selection
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["sorted_l1_witness"]

# How far past the threshold the smallest selections are looked at, in units of tau.
_PAST = 0.1


def sorted_l1_witness(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Witness:
    """Law of effects and weights that attain, or approach, the sorted-L1 boundary at a TPP.

    Asymptotic, for iid Gaussian columns: at finite sizes a fit strays from the point.

    Parameters
    ----------
    tpp : float
        True positive proportion, in (0, 1]; 1 means the limit from below.
    sampling_ratio : float
        Runs per candidate, above 0.
    sparsity : float
        Actives per candidate, in (0, 1).

    Returns
    -------
    Witness
        Its `fdp` is `sorted_l1_boundary` at the point.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    Examples
    --------
    >>> from engine.limits.sorted_l1_witness import sorted_l1_witness
    >>> witness = sorted_l1_witness(0.8, 0.3, 0.2)
    >>> round(witness.fdp, 4), round(witness.law.sizes[0], 2)
    (0.7111, 1.47)
    >>> witness.normalised_weights(5).round(2).tolist()
    [1.33, 0.93, 0.69, 0.69, 0.69]
    """
    u = TPP.check(tpp)
    delta = SAMPLING_RATIO.check(sampling_ratio)
    eps = SPARSITY.check(sparsity)
    (optimum,) = optima(np.array(u), np.array(delta), np.array(eps))
    polar = math.isinf(optimum.sizes[-1])
    penalty = _polar_penalty(optimum, delta, eps) if polar else _finite_penalty(optimum, eps)
    return Witness(
        penalty="sorted-l1",
        tpp=u,
        fdp=optimum.fdp,
        sampling_ratio=delta,
        sparsity=eps,
        zero_threshold=optimum.threshold,
        law=Law(optimum.sizes, optimum.shares),
        risk=penalty.risk,
        slope=penalty.slope,
        smallest_selected=penalty.smallest_selected,
        profile=penalty.profile,
    )


class _Penalty(NamedTuple):
    risk: float
    slope: float
    smallest_selected: float
    profile: Callable[[Array], Array]


def _finite_penalty(optimum: Optimum, eps: float) -> _Penalty:
    sizes, masses = optimum.sizes, tuple(eps * share for share in optimum.shares)
    best = least_risk(optimum.threshold, sizes, masses)
    x, withheld = best.x, best.withheld
    # Share of the estimates beyond each node: the rank, from the top, of an estimate there.
    rank = (1.0 - eps) * selection(np.zeros_like(x), x)
    for size, mass in zip(sizes, masses, strict=True):
        rank += mass * selection(np.full_like(x, size), x)

    def profile(shares: Array) -> Array:
        return np.interp(shares, rank[::-1], withheld[::-1])  # the threshold, past rank[0]

    just_past = optimum.threshold + _PAST
    smallest = just_past - float(np.interp(just_past, x, withheld))
    return _Penalty(best.risk, best.slope, smallest, profile)


def _polar_penalty(optimum: Optimum, delta: float, eps: float) -> _Penalty:
    """Penalty for the polar law; its large effects t come out at min(t + Z - level, t)."""
    alpha, large = optimum.threshold, eps * optimum.shares[-1]
    level = float(level_of(*(np.asarray(value) for value in (alpha, large, delta))))
    risk = float(risk_at(np.asarray(level), np.asarray(large)))
    slope = float((1.0 - large) * 2.0 * ndtr(-level) + large * ndtr(level))

    def profile(shares: Array) -> Array:
        large_noise: Array = -ndtri(np.minimum(shares / large, 1.0))
        small = -ndtri(0.5 * np.clip((shares - large) / (1.0 - large), 0.0, 1.0))
        near: Array = np.clip(small, alpha, level)
        return np.where(shares < large, np.maximum(large_noise, level), near)

    return _Penalty(risk, slope, max(_PAST - (level - alpha), 0.0), profile)
