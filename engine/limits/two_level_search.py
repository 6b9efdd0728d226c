r"""The search for the two-level shrinkage and law that have the largest zero threshold.

*Derived here*; tests verify it against a linear program over laws. The actives have one common
size, or share it with effects that tend to 0. At a fixed threshold b the larger of risk and
E eta' is walked down over (gap, height, size); b is then raised to where it meets the sampling
ratio, and so on in turn. Feasibility is not monotone in b, and there are several valleys: the
walk begins in each of them.

All points of a call are searched side by side on arrays, each by itself: its result does not
depend on the others.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.limits.two_level_moments import null_risk_and_slope, risk_and_slope, selected
from engine.normal import Array, density, tail

__all__ = ["Candidate", "Points", "search"]


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


# The walks: each starts at one of these thresholds, given as parts of the way from the known
# one to the sorted-L1 one, and from the best of a grid of log gaps, heights and extra sizes.
# Narrow gaps win in most studies and infinite ones (a gap of 8 already acts so) in dense ones.
# There the score is nearly flat in b and crosses the ratio several times, so many thresholds
# are tried. Laws that hold effects tending to 0 win in a band just above the power limit: at
# its start they part from the closed form, the known one there; at its end their thresholds
# are nearly those of sorted L1.
_NARROW = np.log(np.geomspace(0.1, 0.9, 5))
_INFINITE = np.log(np.array([8.0]))
_ONE_SIZE = np.zeros(1)
_WITH_ZEROS = np.array([0.15, 0.5, 1.2, 2.5, 5.0])
_WALKS = (
    (np.array([0.9]), _NARROW, _ONE_SIZE),
    (np.append(np.linspace(0.05, 0.95, 19), [0.98, 0.995]), _INFINITE, _ONE_SIZE),
    (np.array([0.05]), _NARROW, _WITH_ZEROS),
    (np.array([0.9]), _NARROW, _WITH_ZEROS),
)
_LOG_HEIGHTS = np.log(np.geomspace(0.004, 6.0, 15))

# The gap, height and extra size that won at a few thousand random points lie inside these
# (logarithms of the first two).
_LEAST_GAP = 0.02
_BOX = ((np.log(_LEAST_GAP), 2.2), (-8.0, 2.2), (0.0, 12.0))

# One step along each coordinate, both ways and none: 27 neighbours, the middle one first.
_STENCIL = np.array(
    sorted(np.ndindex(3, 3, 3), key=lambda ijk: ijk != (1, 1, 1)), dtype=np.float64
) - 1.0  # fmt: skip

# Moves at every threshold tried, to tell them apart.
_TRIAL = 4

# Moves at a fixed threshold, before it is changed again, and Newton steps of the raise.
_ROUNDS = ((4, 7), (3, 3), (3, 3), (3, 3), (3, 3))


def search(points: Points, low: Array, high: Array) -> Candidate:
    """Return the candidate of largest threshold, between what is known and the sorted-L1 one.

    b is -inf where none meets the ratio.
    """
    best = Candidate(np.full_like(low, -np.inf), low * 0.0, low * 0.0, low * 0.0)
    for parts, log_gaps, extras in _WALKS:
        candidate, step = _start(points, low, high, parts, log_gaps, extras)
        b_before, least_before = np.full_like(low, np.nan), low
        for moves, raises in _ROUNDS:
            candidate, step = _descend(points, candidate, step, moves)
            raised, met = _raise(points, candidate, raises)
            best = _choose(met & (raised.b > best.b), raised, best)
            least = _score_of(points, candidate)
            ahead = _secant(candidate.b, b_before, least, least_before, points.delta)
            following = np.where(np.isnan(ahead), raised.b, np.clip(ahead, low, high))
            b_before, least_before = candidate.b, least
            candidate = _at(following, candidate)
            step = np.maximum(step, 0.05 * (step > 0.0))
    return best


def _start(
    points: Points, low: Array, high: Array, parts: Array, log_gaps: Array, extras: Array
) -> tuple[Candidate, Array]:
    """Return the trial of largest threshold that meets the ratio, or the one next to it."""
    n, k = len(low), len(parts)
    trials = Points(*(np.repeat(each, k) for each in (points.u, points.delta, points.eps)))
    b = (low[:, None] + parts * (high - low)[:, None]).ravel()
    candidate = _first(trials, b, log_gaps, extras)
    step = np.tile([0.27, 0.26, 0.3 if extras.any() else 0.0], (n * k, 1))
    candidate, step = _descend(trials, candidate, step, _TRIAL)
    excess = (_score_of(trials, candidate) / trials.delta - 1.0).reshape(n, k)
    # Those that meet the ratio come first, the later the better.
    order = np.where(excess <= 0.0, -parts, excess)
    chosen = np.arange(n) * k + order.argmin(axis=1)
    return _choose_rows(candidate, chosen), step[chosen]


def _first(points: Points, b: Array, log_gaps: Array, extras: Array) -> Candidate:
    """Return the best of a coarse grid at threshold b."""
    grid = np.meshgrid(log_gaps, _LOG_HEIGHTS, extras, indexing="ij")
    gap, height, extra = (axis.ravel() for axis in grid)
    score = _score(points, b, common_size(b, points.u), gap[None], height[None], extra[None])
    k = score.argmin(axis=1)
    return Candidate(b, gap[k], height[k], extra[k])


def _secant(
    b: Array, b_before: Array, least: Array, least_before: Array, delta: Array
) -> Array:
    """Where the least scores at two thresholds aim at delta; nan where they do not rise.

    A stride is at most 0.3 long.
    """
    run, rise = b - b_before, least - least_before
    usable = (run * rise > 0.0) & (np.abs(run) > 1e-5)
    stride = (delta - least) * run / np.where(usable, rise, 1.0)
    ahead: Array = np.where(usable, b + np.clip(stride, -0.3, 0.3), np.nan)
    return ahead


def _descend(
    points: Points, candidate: Candidate, step: Array, moves: int
) -> tuple[Candidate, Array]:
    """Walk downhill at a fixed threshold.

    Each move goes to the best of the stencil and of the two Newton points that quadratics
    fitted to it promise; one that stays within the stencil halves its step.
    """
    b, common = candidate.b, common_size(candidate.b, points.u)
    free = 3 if step[:, 2].any() else 2
    stencil = _STENCIL if free == 3 else _STENCIL[_STENCIL[:, 2] == 0.0]
    fit = _quadratic_fit(stencil[:, :free])
    rows = np.arange(len(step))
    place = np.stack([candidate.log_gap, candidate.log_height, candidate.extra], axis=1)
    least, most = np.array(_BOX).T
    for _ in range(moves):
        near = np.clip(place[:, None, :] + step[:, None, :] * stencil, least, most)
        risk, slope = _moments(points, b, common, *np.moveaxis(near, 2, 0))
        strides = np.zeros((len(step), 2, 3))
        fitted = (_along(fit, risk), _along(fit, slope - risk))
        strides[..., :free] = _strides(*fitted, free)
        far = np.clip(place[:, None, :] + step[:, None, :] * strides, least, most)
        score_far = _score(points, b, common, *np.moveaxis(far, 2, 0))
        score = np.concatenate([np.maximum(risk, slope), score_far], axis=1)
        k = score.argmin(axis=1)  # the middle comes first, so it wins ties
        place = np.concatenate([near, far], axis=1)[rows, k]
        moves_made = np.concatenate([np.broadcast_to(stencil, near.shape), strides], axis=1)
        within = np.abs(moves_made[rows, k]).max(axis=1) < 1.0
        step = np.where(within[:, None], 0.5 * step, step)
    return Candidate(b, place[:, 0], place[:, 1], place[:, 2]), step


def _quadratic_fit(x: Array) -> Array:
    """Matrix from values at the rows of x to the least-squares coefficients of a quadratic.

    They are those of 1, x_i and x_i x_j (i <= j), in this order.
    """
    i, j = np.triu_indices(x.shape[1])
    inverse: Array = np.linalg.pinv(np.column_stack([np.ones(len(x)), x, x[:, i] * x[:, j]]))
    return inverse


def _strides(risk: Array, excess: Array, free: int) -> Array:
    """Steps to the bottom of the fitted risks, without and with slope = risk.

    `excess` is the fitted slope less risk. Shape (n, 2, free); at most 4 stencil steps.
    """
    i, j = np.triu_indices(free)
    hessian = np.zeros((len(risk), free, free))
    hessian[:, i, j] += risk[:, 1 + free :]
    hessian[:, j, i] += risk[:, 1 + free :]
    curvature, axes = np.linalg.eigh(hessian)
    # Along these axes, scaled so, the fitted risk is a sphere: its bottom is straight downhill,
    # and the bottom of a plane through it is the foot of a perpendicular.
    axes = axes / np.sqrt(np.maximum(np.abs(curvature), 1e-12))[:, None, :]
    across = np.swapaxes(axes, 1, 2)
    down = -_along(across, risk[:, 1 : 1 + free])
    rise = _along(across, excess[:, 1 : 1 + free])
    miss = excess[:, 0] + (rise * down).sum(axis=1)
    onto = down - rise * (miss / np.maximum((rise * rise).sum(axis=1), 1e-30))[:, None]
    steps = np.stack([_along(axes, down), _along(axes, onto)], axis=1)
    longest = np.abs(steps).max(axis=2, keepdims=True)
    shortened: Array = steps * np.minimum(1.0, 4.0 / np.maximum(longest, 1e-300))
    return shortened


def _along(matrix: Array, rows: Array) -> Array:
    """matrix @ row for every row; unlike BLAS, to the same digits however many there are."""
    product: Array = (matrix * rows[:, None, :]).sum(axis=-1)
    return product


def _raise(
    points: Points, candidate: Candidate, steps: int
) -> tuple[Candidate, np.ndarray[Any, Any]]:
    """Move b to where the score meets the ratio, and say where that worked."""
    least = -ndtri(0.5 * points.u) + 1e-9  # from here up the nulls leave room for the TPP
    twice = Points(*(np.tile(each, 2) for each in (points.u, points.delta, points.eps)))
    double = _choose_rows(candidate, np.tile(np.arange(len(candidate.b)), 2))
    b = candidate.b
    for _ in range(steps):  # Newton with a numerical slope, in strides of at most 0.15
        score = _score_of(twice, _at(np.concatenate([b, b + _NUDGE]), double))
        excess, nudged = np.split(score - twice.delta, 2)
        slope = np.maximum((nudged - excess) / _NUDGE, 1e-9)
        met = np.abs(excess) < 1e-8 * points.delta
        b = np.where(met, b, np.maximum(b - np.clip(excess / slope, -0.15, 0.15), least))
    return _at(b, candidate), met


_NUDGE = 1e-5


def _at(b: Array, candidate: Candidate) -> Candidate:
    """The candidate at another threshold.

    The upper level stays, for it is the gap that follows b along a valley.
    """
    upper = candidate.b + np.exp(candidate.log_gap)
    log_gap = np.log(np.maximum(upper - b, _LEAST_GAP))
    return Candidate(b, log_gap, candidate.log_height, candidate.extra)


def _score_of(points: Points, candidate: Candidate) -> Array:
    """The larger of risk and E eta' of one candidate a point, shape (n,)."""
    shape = (candidate.log_gap, candidate.log_height, candidate.extra)
    common = common_size(candidate.b, points.u)
    return _score(points, candidate.b, common, *(each[:, None] for each in shape))[:, 0]


def _score(points: Points, b: Array, common: Array, *shape: Array) -> Array:
    """The larger of the two moments below."""
    larger: Array = np.maximum(*_moments(points, b, common, *shape))
    return larger


def _moments(
    points: Points, b: Array, common: Array, log_gap: Array, log_height: Array, extra: Array
) -> tuple[Array, Array]:
    """Risk and E eta', shape (n, m), for laws and shrinkages of shape (n, m).

    b and `common`, the common size at b, have shape (n,).
    """
    b, u, eps = b[:, None], points.u[:, None], points.eps[:, None]
    gap, height, size = np.exp(log_gap), np.exp(log_height), common[:, None] + extra
    weight = eps * _share(size, b, u)
    risk_0, slope_0 = null_risk_and_slope(b, gap, height)
    risk_t, slope_t = risk_and_slope(size, b, gap, height)
    risk = (1.0 - weight) * risk_0 + weight * risk_t
    slope = (1.0 - weight) * slope_0 + weight * slope_t
    return risk, slope


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


def _choose_rows(candidate: Candidate, rows: np.ndarray[Any, Any]) -> Candidate:
    return Candidate(*(getattr(candidate, name)[rows] for name in _FIELDS))


_FIELDS = ("b", "log_gap", "log_height", "extra")


def _choose(which: np.ndarray[Any, Any], one: Candidate, other: Candidate) -> Candidate:
    return Candidate(
        *(np.where(which, getattr(one, name), getattr(other, name)) for name in _FIELDS)
    )
