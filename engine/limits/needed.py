r"""The sampling ratio that a target needs, whatever the signal: the boundaries read backwards.

At a TPP u and an FDP q the zero threshold alpha follows from the sparsity eps,

    Phi(-alpha) = q eps u / (2 (1 - q) (1 - eps)),

and with it the lasso equation of `engine.limits.lasso` is linear in the sampling ratio. Where
its root lies beyond the power limit, the ratio at which the power limit is u takes its place.
With t > 0 the parameter of the transition (`engine.limits.transition`) that ratio solves

    (2 Phi(t) - 1) (eps - eps*(t)) = eps (1 - u),

since (1 - delta) / (1 - eps*) = 2 Phi(t) - 1 on the transition. The Moebius curve of the closed
form, solved for eps*, gives the transition at whose ratio it takes the value q. *Derived here*;
tests verify all three against the boundaries. Picking at random meets a target with
q >= 1 - eps, so that such a target needs no runs.
"""

from functools import lru_cache
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.limits.lasso import least_threshold
from engine.limits.transition import critical, limit, point_at, threshold_at_sparsity
from engine.normal import Array, central, density, null_risk, tail

__all__ = ["closed_form_needs", "lasso_needs", "studies_of_limit"]


def lasso_needs(u: Any, q: Any, eps: Array) -> Array:
    """Least sampling ratio at which some signal lets the lasso meet (u, q), elementwise.

    The arguments are trusted.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.limits.needed import lasso_needs
    >>> lasso_needs(0.5, 0.5, np.array([0.1, 0.2])).round(3).tolist()
    [0.234, 0.326]
    """
    at_random = q >= 1.0 - eps
    eps = np.where(at_random, 0.5 * (1.0 - q), eps)
    alpha = -ndtri(0.5 * q * eps * u / ((1.0 - q) * (1.0 - eps)))
    inside, bend = central(alpha), 2.0 * alpha * density(alpha)
    top = eps * (u * ((1.0 + alpha * alpha) * inside + bend) - bend)
    delta = top / inside + (1.0 - eps) * null_risk(alpha)
    beyond = alpha < least_threshold(delta, eps)
    return np.where(at_random, 0.0, np.where(beyond, _ratio_of_limit(u, eps), delta))


def closed_form_needs(u: Any, q: Any, eps: Array, lasso: Array) -> Array:
    """The same for the closed form of two-level; `lasso` is what the lasso needs there."""
    room = (1.0 - eps) * (1.0 - q) - q * eps * u
    possible = (q < 1.0 - eps) & (room > 0.0)
    eps_star = eps * u * (1.0 - eps - q) / np.where(possible, room, 1.0)
    eps_star = np.where(possible, np.clip(eps_star, 1e-300, 1.0 - 1e-16), 0.5)
    delta = point_at(threshold_at_sparsity(eps_star))[0]
    # At u = 1 the curve is 1 - eps at every ratio below the transition: no lower target is met.
    beyond = possible & (u < 1.0) & (u > limit(delta, eps, critical(delta)))
    return np.where(beyond, np.minimum(delta, lasso), lasso)


@lru_cache(maxsize=64)
def studies_of_limit(power_limit: float) -> tuple[Array, Array]:
    """Return sampling ratios and sparsities, both rising, with a power limit below 1.

    Examples
    --------
    >>> from engine import power_limit
    >>> from engine.limits.needed import studies_of_limit
    >>> ratio, sparsity = studies_of_limit(0.6)
    >>> float(abs(power_limit(ratio, sparsity) - 0.6).max()) < 1e-9
    True
    """
    delta, eps_star = point_at(_T[::-1])
    inside = _INSIDE[::-1]
    room = inside - (1.0 - power_limit)
    reached = room > 0.0
    eps = inside[reached] * eps_star[reached] / room[reached]
    rising = eps < 1.0
    return delta[reached][rising], eps[rising]


def _ratio_of_limit(u: Any, eps: Array) -> Array:
    """The sampling ratio at which the power limit of a sparsity is u."""
    wanted = np.broadcast_to(1.0 - np.asarray(u), eps.shape)
    table = _INSIDE * (1.0 - _CRITICAL / eps[..., None])
    t = _T[np.argmax(table >= wanted[..., None], axis=-1)]
    for _ in range(4):  # the error squares, from the step of the table on
        inside, eps_star = central(t), point_at(t)[1]
        surplus = inside * (eps - eps_star) - eps * wanted
        slope = 2.0 * density(t) * (eps - eps_star)
        slope += inside * (2.0 * tail(t) + eps_star * inside) / (2.0 * density(t) + t * inside)
        t = np.maximum(t - surplus / slope, 0.5 * t)
    return point_at(t)[0]


_T = np.append(np.geomspace(1e-6, 0.02, 60), np.arange(0.04, 12.0, 0.02))
_CRITICAL, _INSIDE = point_at(_T)[1], central(_T)
