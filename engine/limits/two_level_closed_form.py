r"""The two-level boundary in closed form: what two-level penalties are known to reach.

Source: *Characterizing the SLOPE trade-off*, Annals of Statistics 51(1), 2023,
doi 10.1214/22-AOS2194 (formula from memory, verified by two independent programs). Up to the
power limit it is the lasso boundary; beyond, with eps* the critical sparsity, the null share
of the list is affine in the TPP u,

    (selected nulls) / (nulls) = (eps u - eps*) / (eps - eps*),

which makes the FDP a Moebius curve in u, from 1 - eps u*/delta at the power limit u* to
1 - eps at u = 1.
"""

from typing import Any

import numpy as np

from engine.arguments import as_given, check_arrays
from engine.limits.lasso import fdp_below_limit
from engine.limits.transition import critical, limit
from engine.normal import Array
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["two_level_closed_form"]


def two_level_closed_form(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Any:
    """FDP that some two-level penalty reaches at a TPP, in closed form beyond the power limit.

    It is an upper bound of the exact two-level boundary, defined at every TPP. Asymptotic, for
    iid Gaussian columns.

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
        FDP in [0, 1), in the broadcast shape of the arguments.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    References
    ----------
    .. [1] *Characterizing the SLOPE trade-off*, Annals of Statistics 51(1), 2023,
       doi 10.1214/22-AOS2194.

    Examples
    --------
    >>> from engine import two_level_closed_form
    >>> [round(q, 4) for q in two_level_closed_form([0.5, 0.8], 0.3, 0.2).tolist()]
    [0.5493, 0.7634]
    """
    u, delta, eps = check_arrays(
        (TPP, tpp), (SAMPLING_RATIO, sampling_ratio), (SPARSITY, sparsity)
    )
    return as_given(closed_form(u, delta, eps))


def closed_form(u: Array, delta: Array, eps: Array) -> Array:
    """Closed-form boundary, elementwise, for checked arrays."""
    eps_star = critical(delta)
    u_star = limit(delta, eps, eps_star)
    below = fdp_below_limit(np.minimum(u, u_star), delta, eps)
    beyond = u > u_star
    return np.where(beyond, beyond_limit(np.where(beyond, u, 1.0), eps, eps_star), below)


def beyond_limit(u: Array, eps: Array, eps_star: Array) -> Array:
    """The Moebius curve, for u above a power limit below 1."""
    top = (1.0 - eps) * (eps * u - eps_star)
    bottom = eps * (1.0 - eps_star) * u - eps_star * (1.0 - eps)
    return top / np.where(bottom > 0.0, bottom, 1.0)
