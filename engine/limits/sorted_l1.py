r"""The sorted-L1 boundary: the lowest FDP of any sorted-L1 penalty, whatever the signal.

*Characterizing the SLOPE trade-off*, Annals of Statistics 51(1), 2023,
doi 10.1214/22-AOS2194, poses the bound; the reduction is *derived here* and verified by tests.
A TPP u can be had with zero threshold alpha when some law of effects has least risk at most the
sampling ratio delta; the least risk rises with alpha, so the boundary is the largest alpha at
which it is delta. The least risk is concave in the law, and the TPP is one linear condition on
it, so the best law has at most two atoms. Three families hold it wherever it has been looked
for:

- polar: a share l of the actives outgrows tau, the rest tends to 0. Then, in closed form,
  (1 - eps l) null_risk(alpha) + eps l [(1 + alpha^2) Phi(alpha) + alpha phi(alpha)] = delta,
  l = (u - 2 Phi(-alpha)) / (1 - 2 Phi(-alpha)). It is best at low TPP, and the limit at TPP 1.
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
from scipy.optimize import elementwise
from scipy.special import ndtri

from engine.arguments import as_given, check_arrays
from engine.limits.least_risk import least_risk
from engine.limits.two_level_closed_form import closed_form
from engine.normal import Array, density, null_risk, tail
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
        FDP in [0, 1), to about 1e-6, in the broadcast shape of the arguments.

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
    effects that tend to 0 and outgrow tau. They are empty where no law was searched: the FDP
    is below `NEGLIGIBLE`, or the TPP is 1, a limit.
    """

    fdp: float
    threshold: float
    polar: float
    sizes: tuple[float, ...] = ()
    shares: tuple[float, ...] = ()


def optima(u: Array, delta: Array, eps: Array) -> list[Optimum]:
    """Return the optimum at every point of the flattened arrays, each searched by itself."""
    ceiling = closed_form(u, delta, eps)
    polar = polar_threshold(u, delta, eps)
    columns = (array.ravel().tolist() for array in (u, delta, eps, polar, ceiling))
    return [best(*point) for point in zip(*columns, strict=True)]


# An FDP that no study could tell from 0 is not searched further down.
NEGLIGIBLE = 1e-9

# The zero threshold is found this closely; the FDP moves by less than a third of it.
_ACCURACY = 1e-7


def best(u: float, delta: float, eps: float, polar: float, ceiling: float) -> Optimum:
    """Search the three families at one point.

    `polar` is the polar threshold (nan without one), `ceiling` an FDP that is known to be
    reached: the search starts from the better of the two and can only improve on it.
    """
    if ceiling < NEGLIGIBLE or u == 1.0:
        at_polar = ceiling if math.isnan(polar) else fdp_of(polar, u, eps)
        fdp = min(ceiling, at_polar)
        return Optimum(fdp, threshold_of(fdp, u, eps), polar)
    start = threshold_of(ceiling, u, eps)
    alpha, law = start, "single"
    if polar >= start:
        alpha, law = polar, "polar"
    single = _raised_by_single(alpha, u, delta, eps)
    if single > alpha:
        alpha, law = single, "single"
    split, size = _raised_by_split(alpha, u, delta, eps)
    if split > alpha:
        alpha, law = split, "split"
    fdp = min(fdp_of(alpha, u, eps), ceiling)
    if law == "single":
        return Optimum(fdp, alpha, polar, (size_of(alpha, u),), (1.0,))
    if law == "polar":
        size = math.inf
    share = _share_found(alpha, u, size)
    return Optimum(fdp, alpha, polar, (0.0, size), (1.0 - share, share))


def _raised_by_single(alpha: float, u: float, delta: float, eps: float) -> float:
    """Return the largest threshold from `alpha` on that one common size allows."""

    def excess(a: float) -> float:
        return least_risk(a, (size_of(a, u),), (eps,)).risk - delta

    value = excess(alpha)
    return rising_root(excess, alpha, value, 0.05, _ACCURACY) if value < 0.0 else alpha


# The split family is tried where the polar one nearly meets the sampling ratio: it has been
# seen to win only below 2.6 times the ratio.
_SPLIT_RANGE = 4.0

# Sizes tried first, past the common size of the single law; the last one stands for infinity.
_SPLIT_STEPS = (0.4, 1.3, 2.7, 4.7, 9.0)


def _raised_by_split(alpha: float, u: float, delta: float, eps: float) -> tuple[float, float]:
    """Return the largest threshold from `alpha` on that one size and 0 allow, and the size."""
    if polar_risk(np.asarray(alpha), np.asarray(u), np.asarray(eps)) > _SPLIT_RANGE * delta:
        return alpha, 0.0

    def excess(a: float, size: float) -> float:
        return least_risk(a, (size,), (eps * _share_found(a, u, size),)).risk - delta

    bracket = _split_bracket(partial(excess, alpha), size_of(alpha, u), delta)
    size = 0.0
    while bracket is not None:
        size, value = least_on(partial(excess, alpha), *bracket, accuracy=1e-2)
        if value > -1e-7 * delta:
            break
        raised = rising_root(partial(_swapped, excess, size), alpha, value, 0.01, _ACCURACY)
        if raised - alpha < 10.0 * _ACCURACY:
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
        # The risk falls towards that of an infinite size; only below the ratio does it help.
        return (tried[k - 1], tried[k]) if values[k] < -1e-6 * delta else None
    # A size between those tried gains no more than 2 percent.
    if values[k] > 0.02 * delta:
        return None
    return tried[k - 1] if k else common + 1e-3, tried[k + 1]


def _share_found(alpha: float, u: float, size: float) -> float:
    """Share of the actives at `size`, the others tending to 0, that makes the TPP u."""
    at_zero = 2.0 * _cdf(-alpha)
    at_size = 1.0 if math.isinf(size) else _cdf(size - alpha) + _cdf(-size - alpha)
    return min((u - at_zero) / (at_size - at_zero), 1.0)


def size_of(alpha: float, u: float) -> float:
    """The size t with P(|t + Z| > alpha) = u; 0 where even the nulls exceed u."""
    if 2.0 * _cdf(-alpha) >= u:
        return 0.0
    # In t^2 the chance is nearly straight at 0, where in t it is flat; Phi(t - alpha) <= u
    # bounds t from above.
    square = (alpha + float(ndtri(u))) ** 2
    for _ in range(60):
        t = math.sqrt(square)
        gap = _cdf(t - alpha) + _cdf(-t - alpha) - u
        slope = (_pdf(t - alpha) - _pdf(t + alpha)) / (2.0 * t)
        step = gap / slope if slope > 0.0 else 0.0
        following = square - step if step < square else 0.25 * square
        if abs(following - square) <= 1e-14 * (1.0 + square):
            break
        square = following
    return math.sqrt(following)


def fdp_of(alpha: float, u: float, eps: float) -> float:
    """FDP of a list with the share u of the actives and the nulls beyond alpha."""
    false = 2.0 * (1.0 - eps) * _cdf(-alpha)
    return false / (false + eps * u)


def threshold_of(fdp: float, u: float, eps: float) -> float:
    """The zero threshold at which a list with the share u of the actives has this FDP."""
    chance = 0.5 * fdp * eps * u / ((1.0 - fdp) * (1.0 - eps))
    return max(-float(ndtri(chance)), 0.0)


def polar_threshold(u: Array, delta: Array, eps: Array) -> Array:
    """The largest zero threshold of the polar law, elementwise; nan where it has none."""
    bottom = _least_polar(u, eps)
    has_root = polar_risk(bottom, u, eps) < delta
    top = np.maximum(bottom, np.sqrt(2.0 * delta / (eps * u))) + 2.0
    root: Array = elementwise.find_root(
        lambda b, u, delta, eps: polar_risk(b, u, eps) - delta,
        (np.where(has_root, bottom, 0.0), np.where(has_root, top, 1.0)),
        args=(u, delta, eps),
    ).x
    return np.where(has_root, root, np.nan)


def _least_polar(u: Array, eps: Array) -> Array:
    """Where the polar risk is least, by golden section from the threshold of random picks."""
    ratio = 0.6180339887498949
    low = -ndtri(0.5 * u)
    high = low + 12.0  # nulls are below 1e-32 there: the risk has long been rising
    for _ in range(36):  # 12 * 0.618^36 < 1e-6
        left, right = high - ratio * (high - low), low + ratio * (high - low)
        keep = polar_risk(left, u, eps) <= polar_risk(right, u, eps)
        low, high = np.where(keep, low, left), np.where(keep, right, high)
    middle: Array = 0.5 * (low + high)
    return middle


def polar_risk(b: Array, u: Array, eps: Array) -> Array:
    """Least risk of the polar law at zero threshold b."""
    big = eps * polar_share(b, u)
    return (1.0 - big) * null_risk(b) + big * ((1.0 + b * b) * tail(-b) + b * density(b))


def polar_share(b: Array, u: Array) -> Array:
    """Share of the actives that outgrows tau in the polar law at zero threshold b."""
    chance = 2.0 * tail(b)
    return np.clip((u - chance) / np.maximum(1.0 - chance, 1e-300), 0.0, 1.0)


def _cdf(x: float) -> float:
    return 0.5 * math.erfc(-x / _SQRT_2)


def _pdf(x: float) -> float:
    return math.exp(-0.5 * x * x) / _SQRT_2PI


_SQRT_2 = math.sqrt(2.0)
_SQRT_2PI = math.sqrt(2.0 * math.pi)
