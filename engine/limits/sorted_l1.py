r"""The sorted-L1 boundary: the lowest FDP of any sorted-L1 penalty, whatever the signal.

*Characterizing the SLOPE trade-off*, Annals of Statistics 51(1), 2023,
doi 10.1214/22-AOS2194, poses the bound; the reduction is *derived here* and verified by tests.
A TPP u can be had with zero threshold alpha when some law of effects has least risk at most the
sampling ratio delta; the least risk rises with alpha, so the boundary is the largest alpha at
which it is delta. The least risk is concave in the law, and the TPP is one linear condition on
it, so the best law has at most two atoms. Three families hold it wherever it has been looked
for:

- polar: some actives outgrow tau, the others tend to 0 (`engine.limits.polar`, closed form).
  It is best at low TPP, and may be the limit at TPP 1.
- single: every active has the same size. Best from about the power limit on.
- split: some actives have the same finite size, the rest tends to 0. Best in a narrow band
  between the other two.

The tool therefore calls the result a bound with a witness, not a theorem.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.arguments import as_given, check_arrays
from engine.limits.least_risk import least_risk
from engine.limits.polar import polar_risk, polar_threshold, saturated_threshold
from engine.limits.two_level_closed_form import closed_form
from engine.normal import Array
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP
from engine.roots import least_on, rising_root

__all__ = ["sorted_l1_boundary"]


def sorted_l1_boundary(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Any:
    """Lowest FDP that any sorted-L1 penalty can have at a TPP, over all signals and noises.

    Asymptotic (runs and candidates growing at a fixed ratio), for iid Gaussian columns. A
    bound with a witness: `sorted_l1_witness` gives the law and the weights that attain it.

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
        FDP in [0, 1), to about 2e-6, in the broadcast shape of the arguments.

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
    >>> from engine import sorted_l1_boundary
    >>> [round(q, 4) for q in sorted_l1_boundary([0.2, 0.5, 0.8], 0.3, 0.2).tolist()]
    [0.1577, 0.5449, 0.7111]
    """
    u, delta, eps = check_arrays(
        (TPP, tpp), (SAMPLING_RATIO, sampling_ratio), (SPARSITY, sparsity)
    )
    found = [optimum.fdp for optimum in optima(u, delta, eps)]
    return as_given(np.array(found).reshape(u.shape))


@dataclass(frozen=True)
class Optimum:
    """The boundary at one point, the polar threshold (nan without one), and the law.

    `sizes` and `shares` are those of the actives, in units of tau; 0 and infinity stand for
    effects that tend to 0 and outgrow tau.
    """

    fdp: float
    threshold: float
    polar: float
    sizes: tuple[float, ...]
    shares: tuple[float, ...]


def optima(u: Array, delta: Array, eps: Array) -> list[Optimum]:
    """Return the optimum at every point of the flattened arrays, each searched by itself."""
    ceiling = closed_form(u, delta, eps)
    u = np.where(1.0 - u < _ROUNDED, 1.0, u)
    columns = (
        u, delta, eps,
        ceiling,
        polar_threshold(u, delta, eps),
        saturated_threshold(u, delta, eps),
    )  # fmt: skip
    points = zip(*(column.ravel().tolist() for column in columns), strict=True)
    return [best(*point) for point in points]


# An FDP that no study could tell from 0 is not searched further down.
NEGLIGIBLE = 1e-9

# A TPP this close to 1 is told from 1 by rounding only.
_ROUNDED = 1e-12

# The last secant step is shorter; the error left is smaller by far, as secant steps shrink.
_ACCURACY = 1e-6


def best(
    u: float, delta: float, eps: float, ceiling: float, polar: float, saturated: float
) -> Optimum:
    """Search the three families at one point.

    `ceiling` is an FDP that is known to be reached, `polar` and `saturated` are the thresholds
    of the polar law (nan where there is none): the search starts from the best of them.
    """
    if u == 1.0 and math.isnan(polar):
        # The limit is at threshold 0, where any law is selected whole.
        return Optimum(ceiling, 0.0, polar, (0.0,), (1.0,))
    known = [threshold_of(ceiling, u, eps), polar, saturated]
    alpha = max((a for a in known if math.isfinite(a)), default=polar)
    sizes, shares = _split_law(alpha, u, math.inf)
    if ceiling >= NEGLIGIBLE and u < 1.0:
        raised = _raised_by_single(alpha, u, delta, eps)
        if raised > alpha:
            alpha, sizes, shares = raised, (size_of(raised, u),), (1.0,)
        raised, size = _raised_by_split(alpha, u, delta, eps)
        if raised > alpha:
            alpha, (sizes, shares) = raised, _split_law(raised, u, size)
    return Optimum(min(fdp_of(alpha, u, eps), ceiling), alpha, polar, sizes, shares)


def _raised_by_single(alpha: float, u: float, delta: float, eps: float) -> float:
    """Return the largest threshold from `alpha` on that one common size allows."""

    def excess(a: float) -> float:
        return least_risk(a, (size_of(a, u),), (eps,)).risk - delta

    value = excess(alpha)
    if value >= 0.0:
        return alpha
    return rising_root(excess, alpha, value, 0.05, _ACCURACY * min(alpha, 1.0))


# The split family is tried where the polar one nearly meets the sampling ratio: it has been
# seen to win only below 2.6 times the ratio.
_SPLIT_RANGE = 4.0

# Risks this much closer to each other, relatively, are equal up to the quadrature.
_NOISE = 1e-7

# Sizes tried first, past the common size of the single law.
_SPLIT_STEPS = (0.4, 1.3, 2.7, 4.7)


def _raised_by_split(alpha: float, u: float, delta: float, eps: float) -> tuple[float, float]:
    """Return the largest threshold from `alpha` on that one size and 0 allow, and the size."""
    if polar_risk(np.asarray(alpha), np.asarray(u), np.asarray(eps)) > _SPLIT_RANGE * delta:
        return alpha, 0.0

    def excess(a: float, size: float) -> float:
        sizes, shares = _split_law(a, u, size)
        return least_risk(a, sizes[-1:], (eps * shares[-1],)).risk - delta

    bracket = _split_bracket(partial(excess, alpha), size_of(alpha, u), delta)
    size = 0.0
    while bracket is not None:
        size, value = least_on(partial(excess, alpha), *bracket, accuracy=1e-2)
        if value > -_NOISE * delta:
            break
        raised = rising_root(partial(_swapped, excess, size), alpha, value, 0.01, _ACCURACY)
        if raised - alpha < _ACCURACY:
            return raised, size
        alpha, reach = raised, 0.3 * (bracket[1] - bracket[0])
        bracket = (max(size - reach, size_of(alpha, u) + 1e-3), size + reach)
    return alpha, size


def _swapped(excess: Callable[[float, float], float], size: float, a: float) -> float:
    return excess(a, size)


def _split_bracket(
    excess: Callable[[float], float], common: float, delta: float
) -> tuple[float, float] | None:
    """Return sizes around the best one tried, or None where no size can help."""
    tried = [common + step for step in _SPLIT_STEPS]
    values = [excess(size) for size in tried]
    k = values.index(min(values))
    if k == len(tried) - 1:
        # The risk goes on to that of the polar law, which is the sampling ratio or more.
        return (tried[k - 1], tried[k]) if values[k] < -3.0 * _NOISE * delta else None
    # A size between those tried gains no more than 2 percent.
    if values[k] > 0.02 * delta:
        return None
    return tried[k - 1] if k else common + 1e-3, tried[k + 1]


def _split_law(
    alpha: float, u: float, size: float
) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """Return sizes and shares of the actives, `size` and 0, that are found with chance u.

    A size too small to be found that often gives way to the common size.
    """
    at_zero, at_size = _surplus(0.0, alpha, u), _surplus(size, alpha, u)
    if at_zero >= 0.0 or at_size < 0.0:
        return (size_of(alpha, u),), (1.0,)
    share = at_zero / (at_zero - at_size)
    return ((0.0, size), (1.0 - share, share)) if share < 1.0 else ((size,), (1.0,))


def size_of(alpha: float, u: float) -> float:
    """The size t with P(|t + Z| > alpha) = u; 0 where even the nulls exceed u."""
    if _surplus(0.0, alpha, u) >= 0.0:
        return 0.0
    # In t^2 the chance is nearly straight at 0, where in t it is flat; Phi(t - alpha) <= u
    # bounds t from above.
    square = (alpha + float(ndtri(u))) ** 2
    for _ in range(60):
        t = math.sqrt(square)
        slope = (_pdf(t - alpha) - _pdf(t + alpha)) / (2.0 * t)
        step = _surplus(t, alpha, u) / slope if slope > 0.0 else 0.0
        following = square - step if step < square else 0.25 * square
        if abs(following - square) <= 1e-14 * (1.0 + square):
            break
        square = following
    return math.sqrt(following)


def _surplus(t: float, alpha: float, u: float) -> float:
    """P(|t + Z| > alpha) - u, accurate for u near 0 and near 1."""
    if u < 0.5:
        return _cdf(t - alpha) + _cdf(-t - alpha) - u
    return (1.0 - u) - (_cdf(alpha - t) - _cdf(-alpha - t))


def fdp_of(alpha: float, u: float, eps: float) -> float:
    """FDP of a list with the share u of the actives and the nulls beyond alpha."""
    false = 2.0 * (1.0 - eps) * _cdf(-alpha)
    return false / (false + eps * u)


def threshold_of(fdp: float, u: float, eps: float) -> float:
    """The zero threshold at which a list with the share u of the actives has this FDP."""
    chance = 0.5 * fdp * eps * u / max((1.0 - fdp) * (1.0 - eps), 1e-300)
    return max(-float(ndtri(chance)), 0.0)


def _cdf(x: float) -> float:
    return 0.5 * math.erfc(-x / _SQRT_2)


def _pdf(x: float) -> float:
    return math.exp(-0.5 * x * x) / _SQRT_2PI


_SQRT_2 = math.sqrt(2.0)
_SQRT_2PI = math.sqrt(2.0 * math.pi)
