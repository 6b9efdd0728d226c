"""The witness of the two-level boundary: its law of effects, its levels and their share."""

import math
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.limits.lasso import zero_threshold
from engine.limits.polar import polar_share
from engine.limits.sorted_l1 import optima
from engine.limits.transition import critical, limit, threshold_at_ratio
from engine.limits.two_level import two_level_optima
from engine.limits.two_level_moments import Pieces
from engine.limits.witness import Law, Witness
from engine.normal import Array
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["two_level_witness"]

# A gap this wide between the levels is as good as an infinite one: no estimate passes it.
_WIDE = 8.0


def two_level_witness(tpp: Any, sampling_ratio: Any, sparsity: Any) -> Witness:
    """Law of effects and levels that attain, or approach, the two-level boundary at a TPP.

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
        Its `fdp` is `two_level_boundary` at the point; `levels` and `level_share` state the
        penalty.

    Raises
    ------
    ValueError
        If an argument is not a finite number in its interval.

    Examples
    --------
    >>> from engine.limits.two_level_witness import two_level_witness
    >>> witness = two_level_witness(0.8, 0.3, 0.2)
    >>> round(witness.fdp, 3), [round(level, 1) for level in witness.levels]
    (0.719, [1.7, 0.7])
    """
    u, delta, eps = (
        TPP.check(tpp),
        SAMPLING_RATIO.check(sampling_ratio),
        SPARSITY.check(sparsity),
    )
    point = tuple(np.array([value]) for value in (u, delta, eps))
    found = two_level_optima(*point)
    fdp = float(found.fdp[0])
    if found.kind[0] == "searched":
        pieces = Pieces(found.threshold.item(), found.gap.item(), found.height.item())
        share = found.share.item()
        law = _law((0.0, found.size.item()), (1.0 - share, share))
    elif found.kind[0] == "polar":
        threshold = optima(*point)[0].polar
        share = polar_share(np.asarray(threshold), np.asarray(u)).item()
        pieces = Pieces(threshold, _WIDE, math.inf)
        law = Law((0.0, math.inf), (1.0 - share, share))
    else:
        pieces, law = _closed_form(*point)
    level_share = pieces.level_share(law, eps)
    risk, slope = pieces.risk_and_slope_of(law, eps)
    return Witness(
        penalty="two-level",
        tpp=u,
        fdp=fdp,
        sampling_ratio=delta,
        sparsity=eps,
        zero_threshold=pieces.b,
        law=law,
        risk=risk,
        slope=slope,
        smallest_selected=min(0.1, pieces.h),
        profile=lambda r: np.where(r < level_share, pieces.b + pieces.gap, pieces.b),
        levels=(pieces.b + pieces.gap, pieces.b),
        level_share=level_share,
    )


def _law(sizes: tuple[float, ...], shares: tuple[float, ...]) -> Law:
    kept = [(size, share) for size, share in zip(sizes, shares, strict=True) if share > 0.0]
    return Law(tuple(size for size, _ in kept), tuple(share for _, share in kept))


def _closed_form(u: Array, delta: Array, eps: Array) -> tuple[Pieces, Law]:
    """The lasso's witness up to the power limit; beyond, two levels with h tending to 0."""
    eps_star = critical(delta)
    u_star = limit(delta, eps, eps_star)
    if u[0] <= u_star[0]:
        t = zero_threshold(u, delta, eps).item()
        chance = math.erfc(t / math.sqrt(2.0))
        big = (u.item() - chance) / (1.0 - chance)
        return Pieces(t, 0.0, 0.0), _law((0.0, math.inf), (1.0 - big, big))
    top = threshold_at_ratio(delta).item()
    nulls = (eps * u - eps_star) / (eps - eps_star)  # 2 Phi(-b)
    b = max(0.0, -ndtri(0.5 * nulls).item())
    big = (eps_star / eps).item()
    return Pieces(b, max(top - b, 0.0), 0.0), Law((0.0, math.inf), (1.0 - big, big))
