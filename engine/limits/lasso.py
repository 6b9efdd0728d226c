r"""The lasso boundary: the lowest FDP at a TPP, whatever the signal, noise and strength.

Source: *False discoveries occur early on the lasso path*, Annals of Statistics 45(5), 2017,
arXiv 1511.01957 (formula from memory, verified by two independent programs). With t the
normalised zero threshold of the fit, delta the sampling ratio, eps the sparsity, u the TPP:

    u(t) = [2 eps t phi(t) + P (delta - (1 - eps) null_risk(t))]
           / (eps [(1 + t^2) P + 2 t phi(t)]),      P = P(|Z| <= t),
    FDP = 2 (1-eps) Phi(-t) / (2 (1-eps) Phi(-t) + eps u).

This is the published equation solved for u, which also takes the cancellation out of it. The
signal that attains it has tiny and huge effects only, and noise tending to 0.
"""

from typing import Any

import numpy as np
from scipy.optimize import elementwise

from engine.arguments import as_given, check_arrays
from engine.limits.transition import (
    critical,
    limit,
    threshold_at_ratio,
    threshold_at_sparsity,
)
from engine.limits.witness import Law, Witness
from engine.normal import Array, central, density, null_risk, tail
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["lasso_boundary", "lasso_witness"]


def lasso_boundary(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Any:
    """Lowest FDP that the lasso can have at a TPP, over all signals, noises and strengths.

    "Found" means nonzero in the fit. Asymptotic (runs and candidates growing at a fixed
    ratio), for iid Gaussian columns.

    Parameters
    ----------
    tpp : float or array_like
        True positive proportion, in (0, 1]; 1 means the limit from below.
    sampling_ratio : float or array_like
        Runs per candidate, above 0.
    sparsity : float or array_like
        Actives per candidate, in (0, 1).

    Returns
    -------
    float or ndarray
        FDP in [0, 1), in the broadcast shape of the arguments; nan at and above a power
        limit below 1, where the lasso has no point.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    References
    ----------
    .. [1] *False discoveries occur early on the lasso path*, Annals of Statistics 45(5), 2017,
       arXiv 1511.01957.

    Examples
    --------
    >>> from engine import lasso_boundary
    >>> [round(q, 4) for q in lasso_boundary([0.3, 0.5, 0.6], 0.3, 0.2).tolist()]
    [0.3317, 0.5493, nan]
    """
    u, delta, eps = check_arrays(
        (TPP, tpp), (SAMPLING_RATIO, sampling_ratio), (SPARSITY, sparsity)
    )
    eps_star = critical(delta)
    u_star = limit(delta, eps, eps_star)
    beyond = (u >= u_star) & (u_star < 1.0)
    reached = np.where(beyond, 0.5 * u_star, u)
    return as_given(np.where(beyond, np.nan, fdp_below_limit(reached, delta, eps)))


def lasso_witness(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Witness:
    """Law of effects with which equal weights approach the lasso boundary at a TPP.

    Asymptotic, for iid Gaussian columns: at finite sizes a fit strays from the point.

    Parameters
    ----------
    tpp : float
        True positive proportion, in (0, 1], below the power limit where that is below 1;
        1 means the limit from below.
    sampling_ratio : float
        Runs per candidate, above 0.
    sparsity : float
        Actives per candidate, in (0, 1).

    Returns
    -------
    Witness
        Its `fdp` is `lasso_boundary` at the point.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval, or no lasso has this TPP.

    Examples
    --------
    >>> from engine.limits.lasso import lasso_witness
    >>> witness = lasso_witness(0.5, 0.3, 0.2)
    >>> round(witness.fdp, 4), [round(share, 3) for share in witness.law.shares]
    (0.5493, [0.59, 0.41])
    """
    numbers = TPP.check(tpp), SAMPLING_RATIO.check(sampling_ratio), SPARSITY.check(sparsity)
    u, delta, eps = (np.array(number) for number in numbers)
    u_star = limit(delta, eps, critical(delta))
    if u >= u_star and u_star < 1.0:
        raise ValueError(f"tpp must be below the power limit, {u_star:.6g} here, not {u:.6g}")
    t = zero_threshold(u, delta, eps)
    chance = 2.0 * tail(t)
    large = (u - chance) / (1.0 - chance)  # share of the actives that outgrows tau
    found = (1.0 - eps * large) * chance + eps * large
    level = float(t)
    return Witness(
        penalty="lasso",
        tpp=float(u),
        fdp=float(fdp_at(t, u, eps)),
        sampling_ratio=float(delta),
        sparsity=float(eps),
        zero_threshold=level,
        law=Law((0.0, np.inf), (float(1.0 - large), float(large))),
        risk=float((1.0 - eps * large) * null_risk(t) + eps * large * (1.0 + t * t)),
        slope=float(found),
        smallest_selected=0.1,
        profile=lambda shares: np.full_like(shares, level),
    )


def fdp_below_limit(u: Array, delta: Array, eps: Array) -> Array:
    """Lasso boundary at u up to the power limit, the limit itself included."""
    t = zero_threshold(u, delta, eps)
    return fdp_at(t, u, eps)


def zero_threshold(u: Array, delta: Array, eps: Array) -> Array:
    """The normalised zero threshold t that attains the boundary at u, up to the power limit."""
    # u(t) falls from the larger of the two stationary points on: above the power limit the
    # equation has smaller roots too, which belong to no lasso fit.
    low = least_threshold(delta, eps)
    # For large t, u(t) tends to delta / (eps (1 + t^2)) from below plus 2 phi terms.
    high = np.maximum(low, np.sqrt(delta / (eps * u))) + 1.0
    result = elementwise.find_root(
        lambda t, u, delta, eps: tpp_at(t, delta, eps) - u,
        (low, high),
        args=(u, delta, eps),
    )
    # At the power limit itself rounding can leave the bracket without a change of sign.
    return np.where(result.success, result.x, low)


def least_threshold(delta: Array, eps: Array) -> Array:
    """The t from which u(t) falls: where the power limit, or a TPP of 1, is met or passed."""
    below = delta < 1.0
    at_ratio = np.where(below, threshold_at_ratio(np.where(below, delta, 0.5)), 0.0)
    return np.maximum(at_ratio, threshold_at_sparsity(eps))


def tpp_at(t: Array, delta: Array, eps: Array) -> Array:
    """u(t), the TPP whose boundary point has zero threshold t."""
    inside = central(t)
    bend = 2.0 * t * density(t)
    top = eps * bend + inside * (delta - (1.0 - eps) * null_risk(t))
    return top / (eps * ((1.0 + t * t) * inside + bend))


def fdp_at(t: Array, u: Array, eps: Array) -> Array:
    """FDP of a list that holds the share u of the actives and the nulls beyond t."""
    false = 2.0 * (1.0 - eps) * tail(t)
    return false / (false + eps * u)
