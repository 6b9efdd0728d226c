r"""The exact two-level boundary: the lowest FDP of any two-level penalty, whatever the signal.

Source of the problem: *Sharp trade-offs in high-dimensional inference via 2-level SLOPE*, arXiv
2507.09110, 2025 (formulas from memory). The search is *derived here*; tests verify it against a
linear program over laws on a dense grid of shrinkages. A TPP u can be had with zero threshold b
when for some shrinkage (gap between the levels, height h of its flat stretch) and some law of
effects both the risk and E eta' are at most the sampling ratio delta; the second condition
holds because a fit with more distinct sizes than runs does not exist. The boundary is the
largest such b. Wherever it has been looked for, one of these attains it:

- the closed form (`engine.limits.two_level_closed_form`), the lasso boundary included;
- the polar law of `engine.limits.sorted_l1`, where its E eta' leaves it admissible: then
  two-level does as well as any sorted-L1 penalty;
- a law whose actives have one common size, or share it with effects that tend to 0, searched
  here over (gap, h, size).

All points of a call are searched side by side on arrays, each by itself: its result does not
depend on the others.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.arguments import as_given, check_arrays
from engine.limits.polar import polar_share
from engine.limits.sorted_l1 import NEGLIGIBLE, optima, threshold_of
from engine.limits.two_level_closed_form import closed_form
from engine.limits.two_level_moments import null_risk_and_slope, risk_and_slope, selected
from engine.normal import Array, density, tail
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
        FDP in [0, 1), to about 5e-5, in the broadcast shape of the arguments.

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
        found = _search(points, _thresholds(known[open_], points), top)
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


@dataclass(frozen=True)
class Points:
    """TPP, sampling ratio and sparsity of the points searched, each of shape (n,)."""

    u: Array
    delta: Array
    eps: Array


@dataclass(frozen=True)
class Candidate:
    """One shrinkage and law a point: threshold b, log gap, log height, and the actives' size
    past the smallest that can give the TPP; each of shape (n,)."""

    b: Array
    log_gap: Array
    log_height: Array
    extra: Array

    def law(self, points: Points) -> tuple[Array, Array]:
        """Return the actives' common size and the share of the actives that has it."""
        size = common_size(self.b, points.u) + self.extra
        return size, _share(size, self.b, points.u)


# Where the search begins: the gap, height and extra size that won at a few hundred random
# points lie well inside these; a gap of 8 already acts as an infinite one.
_LOG_GAPS = np.log(np.geomspace(0.1, 8.0, 9))
_LOG_HEIGHTS = np.log(np.geomspace(0.004, 6.0, 15))
_EXTRAS = np.array([0.15, 0.5, 1.2, 2.5, 5.0])
_BOX = ((-4.0, 2.2), (-8.0, 2.2), (0.0, 12.0))

# One step along each coordinate, both ways and none: 27 neighbours, the middle one first.
_STENCIL = np.array(
    sorted(np.ndindex(3, 3, 3), key=lambda ijk: ijk != (1, 1, 1)), dtype=np.float64
) - 1.0  # fmt: skip


def _search(points: Points, low: Array, high: Array) -> Candidate:
    """Return the candidate of largest threshold, between what is known and the sorted-L1 one.

    b is -inf where none meets the ratio.
    """
    start = low + 0.65 * (high - low)
    best = Candidate(np.full_like(low, -np.inf), low * 0.0, low * 0.0, low * 0.0)
    for extras in (np.zeros(1), _EXTRAS):
        candidate = _first(points, start, extras)
        step = np.tile([0.27, 0.26, 0.3 if extras.any() else 0.0], (len(low), 1))
        for moves in (12, 8, 8):
            candidate, step = _descend(points, candidate, step, moves)
            candidate, met = _raise(points, candidate)
            best = _choose(met & (candidate.b > best.b), candidate, best)
            step = np.maximum(step, 0.02 * (step > 0.0))
    return best


def _first(points: Points, b: Array, extras: Array) -> Candidate:
    """Return the best of a coarse grid at threshold b."""
    grid = np.meshgrid(_LOG_GAPS, _LOG_HEIGHTS, extras, indexing="ij")
    gap, height, extra = (axis.ravel() for axis in grid)
    score = _score(points, b, gap[None], height[None], extra[None])
    k = score.argmin(axis=1)
    return Candidate(b, gap[k], height[k], extra[k])


def _descend(
    points: Points, candidate: Candidate, step: Array, moves: int
) -> tuple[Candidate, Array]:
    """Walk downhill on the stencil at a fixed threshold, halving the step where none helps."""
    stencil = _STENCIL if step[:, 2].any() else _STENCIL[_STENCIL[:, 2] == 0.0]
    rows = np.arange(len(step))
    place = np.stack([candidate.log_gap, candidate.log_height, candidate.extra], axis=1)
    for _ in range(moves):
        near = place[:, None, :] + step[:, None, :] * stencil
        for axis, (least, most) in enumerate(_BOX):
            near[..., axis] = np.clip(near[..., axis], least, most)
        score = _score(points, candidate.b, near[..., 0], near[..., 1], near[..., 2])
        k = score.argmin(axis=1)  # the middle comes first, so it wins ties
        place = near[rows, k]
        step = np.where((k == 0)[:, None], 0.5 * step, step)
    return Candidate(candidate.b, place[:, 0], place[:, 1], place[:, 2]), step


def _raise(points: Points, candidate: Candidate) -> tuple[Candidate, np.ndarray[Any, Any]]:
    """Move b to where the score meets the ratio, and say where that worked."""
    least = -ndtri(0.5 * points.u) + 1e-9  # from here up the nulls leave room for the TPP
    shape = (
        candidate.log_gap[:, None],
        candidate.log_height[:, None],
        candidate.extra[:, None],
    )
    b = candidate.b
    for _ in range(7):  # Newton with a numerical slope, in strides of at most 0.15
        pair = [_score(points, b + nudge, *shape)[:, 0] for nudge in (0.0, _NUDGE)]
        slope = np.maximum((pair[1] - pair[0]) / _NUDGE, 1e-9)
        b = np.maximum(b - np.clip((pair[0] - points.delta) / slope, -0.15, 0.15), least)
    met = np.abs(_score(points, b, *shape)[:, 0] - points.delta) < 1e-8 * points.delta
    raised = Candidate(b, candidate.log_gap, candidate.log_height, candidate.extra)
    return raised, met


_NUDGE = 1e-5


def _score(points: Points, b: Array, log_gap: Array, log_height: Array, extra: Array) -> Array:
    """The larger of risk and E eta', shape (n, m), for b of shape (n,) and the rest (n, m)."""
    least = common_size(b, points.u)[:, None]
    b, u, eps = b[:, None], points.u[:, None], points.eps[:, None]
    gap, height, size = np.exp(log_gap), np.exp(log_height), least + extra
    weight = eps * _share(size, b, u)
    risk_0, slope_0 = null_risk_and_slope(b, gap, height)
    risk_t, slope_t = risk_and_slope(size, b, gap, height)
    risk = (1.0 - weight) * risk_0 + weight * risk_t
    slope = (1.0 - weight) * slope_0 + weight * slope_t
    larger: Array = np.maximum(risk, slope)
    return larger


def common_size(b: Array, u: Array) -> Array:
    """The size t with P(|t + Z| > b) = u, elementwise; as `sorted_l1.size_of`."""
    square = np.maximum(b + ndtri(u), 0.01) ** 2
    for _ in range(12):
        t = np.sqrt(square)
        slope = (density(t - b) - density(t + b)) / (2.0 * t)
        step = (selected(t, b) - u) / np.maximum(slope, 1e-300)
        square = np.where(step < square, square - step, 0.25 * square)
    size: Array = np.sqrt(square)
    return size


def _share(size: Array, b: Array, u: Array) -> Array:
    """Share of the actives at `size`, the others tending to 0, that makes the TPP u."""
    at_zero = 2.0 * tail(b)
    room = np.maximum(selected(size, b) - at_zero, 1e-300)
    share: Array = np.clip((u - at_zero) / room, 0.0, 1.0)
    return share


def _choose(which: np.ndarray[Any, Any], one: Candidate, other: Candidate) -> Candidate:
    return Candidate(
        *(
            np.where(which, getattr(one, name), getattr(other, name))
            for name in ("b", "log_gap", "log_height", "extra")
        )
    )


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
