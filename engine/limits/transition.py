r"""The phase transition of L1 recovery and the power limit of the lasso.

Source: *Message-passing algorithms for compressed sensing*, PNAS 106(45), 2009,
doi 10.1073/pnas.0909892106 (formula from memory, verified by two independent programs).
The transition is a curve in t > 0, the normalised zero threshold at which it is met:

    D(t) = 2 phi(t) + t (2 Phi(t) - 1),
    sampling ratio delta(t) = 2 phi(t) / D(t),
    critical sparsity eps*(t) = 2 (phi(t) - t Phi(-t)) / D(t).

delta falls from 1 to 0 as t grows. From a sampling ratio of 1 on there is no transition.
"""

import math
from collections.abc import Callable
from typing import Any

import numpy as np

from engine.arguments import as_given, check_arrays
from engine.normal import Array, central, density, mills
from engine.quantities import SAMPLING_RATIO, SPARSITY

__all__ = ["critical_sparsity", "power_limit"]


def critical_sparsity(sampling_ratio: Any) -> Any:
    """Sparsity at which the phase transition stands, 1 for sampling ratios from 1 on.

    Below it the lasso finds every active when their effects are large enough; above it the
    power limit is below 1. Asymptotic, for iid Gaussian columns.

    Parameters
    ----------
    sampling_ratio : float or array_like
        Runs per candidate, above 0.

    Returns
    -------
    float or ndarray
        Critical sparsity in (0, 1], in the shape of `sampling_ratio`.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    References
    ----------
    .. [1] *Message-passing algorithms for compressed sensing*, PNAS 106(45), 2009,
       doi 10.1073/pnas.0909892106.

    Examples
    --------
    >>> from engine import critical_sparsity
    >>> round(critical_sparsity(0.3), 9)
    0.08723531
    """
    (delta,) = check_arrays((SAMPLING_RATIO, sampling_ratio))
    return as_given(critical(delta))


def power_limit(sampling_ratio: Any, sparsity: Any) -> Any:
    """Largest TPP that the lasso can approach at any signal, noise and strength.

    Asymptotic, for iid Gaussian columns.

    Parameters
    ----------
    sampling_ratio : float or array_like
        Runs per candidate, above 0.
    sparsity : float or array_like
        Actives per candidate, in (0, 1).

    Returns
    -------
    float or ndarray
        Power limit in (0, 1], in the broadcast shape of the arguments.

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
    >>> from engine import power_limit
    >>> round(power_limit(0.3, 0.2), 4)
    0.5676
    """
    delta, eps = check_arrays((SAMPLING_RATIO, sampling_ratio), (SPARSITY, sparsity))
    return as_given(limit(delta, eps, critical(delta)))


def critical(delta: Array) -> Array:
    """eps*(delta), elementwise, for checked arrays."""
    below = delta < 1.0
    t = threshold_at_ratio(np.where(below, delta, 0.5))
    return np.where(below, _sparsity_at(t), 1.0)


def limit(delta: Array, eps: Array, eps_star: Array) -> Array:
    """Power limit u* = 1 - (1 - delta)(eps - eps*) / (eps (1 - eps*)), else 1."""
    above = (delta < 1.0) & (eps > eps_star)
    gap = np.where(above, 1.0 - eps_star, 1.0)
    return np.where(above, 1.0 - (1.0 - delta) * (eps - eps_star) / (eps * gap), 1.0)


def threshold_at_ratio(delta: Array) -> Array:
    """t at which the transition passes a sampling ratio in (0, 1)."""
    return _invert(_ratio_log_odds, _RATIO_TABLE, np.log1p(-delta) - np.log(delta))


def threshold_at_sparsity(eps: Array) -> Array:
    """Minimax soft threshold: t of least (1 - eps) null_risk(t) + eps (1 + t^2)."""
    return _invert(_sparsity_log_odds, _SPARSITY_TABLE, np.log1p(-eps) - np.log(eps))


def near_threshold_at_ratio(delta: float) -> float:
    """`threshold_at_ratio` of one number to about 1e-4, for drawing."""
    odds = math.log1p(-delta) - math.log(delta)
    return math.exp(np.interp(odds, _RATIO_TABLE, _LOG_T))


def near_threshold_at_sparsity(eps: float) -> float:
    """`threshold_at_sparsity` of one number to about 1e-4, for drawing."""
    odds = math.log1p(-eps) - math.log(eps)
    return math.exp(np.interp(odds, _SPARSITY_TABLE, _LOG_T))


def point_at(t: Array) -> tuple[Array, Array]:
    """Sampling ratio and critical sparsity of the transition at t."""
    return 2.0 / (2.0 + t * central(t) / density(t)), _sparsity_at(t)


def _sparsity_at(t: Array) -> Array:
    # phi and t Phi(-t) nearly cancel for large t; their ratio does not.
    return 2.0 * (1.0 - t * mills(t)) / (2.0 + t * central(t) / density(t))


def _ratio_log_odds(t: Array) -> tuple[Array, Array]:
    """log((1 - delta) / delta) on the transition, and its slope in log t."""
    # delta = 2 phi / D gives (1 - delta) / delta = t (2 Phi(t) - 1) / (2 phi(t)).
    value = np.log(t) + np.log(central(t)) - np.log(2.0 * _PHI_0) + 0.5 * t * t
    return value, 1.0 + 2.0 * t * density(t) / central(t) + t * t


def _sparsity_log_odds(t: Array) -> tuple[Array, Array]:
    """log((1 - eps) / eps) where t is the minimax threshold of eps, and its slope in log t."""
    # The risk is stationary where eps t = 2 (1 - eps) (phi(t) - t Phi(-t)).
    ratio = mills(t)
    rest = 1.0 - t * ratio
    value = np.log(t) - np.log(2.0 * _PHI_0 * rest) + 0.5 * t * t
    return value, 1.0 + t * t + t * (ratio * (1.0 + t * t) - t) / rest


# Both curves rise with log t, are straight below the table (t = 2e-9) and leave double
# precision above it (t = 38), so a look-up starts Newton within its quadratic range.
_PHI_0 = float(density(np.asarray(0.0)))
_LOG_T = np.linspace(-20.0, 3.64, 1200)
_RATIO_TABLE = _ratio_log_odds(np.exp(_LOG_T))[0]
_SPARSITY_TABLE = _sparsity_log_odds(np.exp(_LOG_T))[0]


def _invert(curve: Callable[[Array], tuple[Array, Array]], table: Array, value: Array) -> Array:
    """t at which `curve` takes `value`, elementwise."""
    log_t = np.interp(value, table, _LOG_T)
    for _ in range(3):  # the error squares: 1e-4, 1e-8, 1e-16
        at, slope = curve(np.exp(log_t))
        log_t = log_t - (at - value) / slope
    return np.exp(log_t)
