r"""The exact two-level boundary: the lowest FDP of any two-level penalty, whatever the signal.

Source of the problem: *Sharp trade-offs in high-dimensional inference via 2-level SLOPE*, arXiv
2507.09110, 2025 (formulas from memory). The search is *derived here*; tests verify it against
linear programs over all laws, polished over the shrinkages. A TPP u can be had with zero
threshold b when for some shrinkage (gap between the levels, height h of its flat stretch) and
some law of effects both the risk and E eta' are at most the sampling ratio delta; the second
condition holds because a fit with more distinct sizes than runs does not exist. The boundary is
the largest such b. Wherever it has been looked for, one of these attains it:

- the closed form (`engine.limits.two_level_closed_form`), the lasso boundary included;
- the polar law of `engine.limits.sorted_l1`, where its E eta' leaves it admissible: then
  two-level does as well as any sorted-L1 penalty;
- a law whose actives have one common size, or share it with effects that tend to 0, searched
  for in `engine.limits.two_level_search`.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np

from engine.arguments import as_given, check_arrays
from engine.limits.polar import polar_share
from engine.limits.sorted_l1 import NEGLIGIBLE, optima, threshold_of
from engine.limits.two_level_closed_form import closed_form
from engine.limits.two_level_search import Points, search
from engine.normal import Array, tail
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["two_level_boundary"]


def two_level_boundary(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Any:
    """Lowest FDP that any two-level penalty can have at a TPP, over all signals and noises.

    Asymptotic (runs and candidates growing at a fixed ratio), for iid Gaussian columns. A
    bound with a witness: `two_level_witness` gives the law and the levels that attain it.

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
        FDP in [0, 1), to 2e-4, in the broadcast shape of the arguments.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    References
    ----------
    .. [1] *Sharp trade-offs in high-dimensional inference via 2-level SLOPE*, arXiv
       2507.09110, 2025.

    Examples
    --------
    >>> from engine import two_level_boundary
    >>> [round(q, 3) for q in two_level_boundary([0.4, 0.6, 0.8], 0.3, 0.2).tolist()]
    [0.452, 0.615, 0.719]
    """
    u, delta, eps = check_arrays(
        (TPP, tpp), (SAMPLING_RATIO, sampling_ratio), (SPARSITY, sparsity)
    )
    found = two_level_optima(u.ravel(), delta.ravel(), eps.ravel())
    return as_given(found.fdp.reshape(u.shape))


@dataclass(frozen=True)
class TwoLevelOptima:
    """The boundary at each point, and what attains it.

    `kind` is 'closed form', 'polar' or 'searched'; only then do the others hold numbers: the
    zero threshold b, gap a - b, height h, and the actives' common size with their share (the
    other actives tend to 0).
    """

    fdp: Array
    kind: list[str]
    threshold: Array
    gap: Array
    height: Array
    size: Array
    share: Array


def two_level_optima(u: Array, delta: Array, eps: Array) -> TwoLevelOptima:
    """Return the optimum at every point of three flat arrays."""
    ceiling = closed_form(u, delta, eps)
    floors = optima(u, delta, eps)
    floor = np.array([optimum.fdp for optimum in floors])
    polar = np.array([optimum.polar for optimum in floors])
    at_polar = np.where(_admitted(polar, u, delta, eps), _fdp(polar, u, eps), 1.0)
    known = np.minimum(ceiling, at_polar)
    kind = np.where(at_polar < ceiling, "polar", "closed form").astype(object)
    blank = np.full(u.shape, np.nan)
    result = {name: blank.copy() for name in ("threshold", "gap", "height", "size", "share")}

    open_ = (known > floor + NEGLIGIBLE) & (u < 1.0)
    if open_.any():
        top = np.array([optimum.threshold for optimum in floors])[open_]
        points = Points(u[open_], delta[open_], eps[open_])
        found = search(points, _thresholds(known[open_], points), top)
        better = _fdp(found.b, points.u, points.eps) < known[open_]
        at = np.flatnonzero(open_)[better]
        kind[at] = "searched"
        known[at] = _fdp(found.b, points.u, points.eps)[better]
        size, share = found.law(points)
        for name, values in (
            ("threshold", found.b),
            ("gap", np.exp(found.log_gap)),
            ("height", np.exp(found.log_height)),
            ("size", size),
            ("share", share),
        ):
            result[name][at] = values[better]
    # Both searches stop within their accuracies: the order of the two is kept here.
    return TwoLevelOptima(np.maximum(known, floor), kind.tolist(), **result)


def _admitted(polar: Array, u: Array, delta: Array, eps: Array) -> np.ndarray[Any, Any]:
    """Whether the polar law has a threshold and E eta' <= delta there."""
    b = np.nan_to_num(polar)
    big = eps * polar_share(b, u)
    slope = (1.0 - big) * 2.0 * tail(b) + big * tail(-b)
    return ~np.isnan(polar) & (slope <= delta)


def _fdp(b: Array, u: Array, eps: Array) -> Array:
    false = 2.0 * (1.0 - eps) * tail(np.maximum(np.nan_to_num(b, neginf=0.0), 0.0))
    fdp: Array = false / (false + eps * u)
    return fdp


def _thresholds(fdp: Array, points: Points) -> Array:
    return np.array(
        [threshold_of(*point) for point in zip(fdp, points.u, points.eps, strict=True)]
    )
