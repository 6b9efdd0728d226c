r"""The certified sorted-L1 fit: a working set of columns around restricted fits.

    minimise  1/2 ||y - X b||^2 + sum_i lambda_i |b|_(i),   |b|_(1) >= |b|_(2) >= ...

A pass over the whole design gives the duality gap and the columns that the proximal step
prox_lambda(b + X'r) calls in; the fit on the columns met so far is done in their Gram matrix.
A fit is finished when the gap is small enough *and* its zeros are those of proximal steps of
several lengths. Along a path the columns, their Gram matrix and the last fit are kept.
"""

from dataclasses import dataclass

import numpy as np

from engine.fit.certificate import (
    least_empty_scale,
    relative_gap,
    sorted_penalty,
    unsettled,
)
from engine.fit.gram import Matrix, WorkingSet
from engine.fit.prox import Indices, clusters, prox_blocks
from engine.fit.restricted import minimise
from engine.normal import Array

__all__ = ["Solution", "Solver"]

# The gap to which the larger scales on the way to a cold fit are solved.
_COARSE = 3e-2

# Passes over the design on the way to one gap; the problems tried needed far fewer.
_MOST_PASSES = 100
# A gap that rounding does not let a pass measure.
_ROUNDING = 1e-14
# Tries at settling the zeros, each to a 30 times smaller gap.
_MOST_SETTLES = 4
# How much closer than the gap asked for a restricted fit is tried when passes stop helping.
_LEAST_EXACTNESS = 1e-3


@dataclass(frozen=True)
class Solution:
    """A fit of the problem as the solver has it.

    Attributes
    ----------
    b, r, g : ndarray
        Coefficients, residuals y - X b, and X'r.
    gap : float
        Relative duality gap.
    certified : bool
        Whether the gap is at most the one asked for.
    undecided : ndarray of int
        Positions whose being zero is not settled at this gap.
    passes : int
        Passes over the whole design.
    """

    b: Array
    r: Array
    g: Array
    gap: float
    certified: bool
    undecided: Indices
    passes: int


@dataclass(frozen=True)
class _Pass:
    r: Array
    g: Array
    gap: float
    passes: int


class Solver:
    """Sorted-L1 fits of one response on one design, each started from the last.

    Parameters
    ----------
    X : ndarray, shape (n, p)
        The design; columns of about the same length. Columns of zeros are never selected.
    y : ndarray, shape (n,)
        The response.
    """

    def __init__(self, X: Matrix, y: Array) -> None:
        self._X = X
        self._y = y
        self._y_y = float(y @ y)
        self._held = WorkingSet(X, y)
        self._b = np.zeros(X.shape[1])
        self._at_zero = X.T @ y

    def solve(self, weights: Array, gap: float) -> Solution:
        """Return the fit at nonincreasing `weights`, the first above 0, to a relative gap."""
        passes = 0
        if not self._b.any():
            for scale in _descent(least_empty_scale(self._at_zero, weights)):
                passes += self._approach(scale * weights, _COARSE).passes
        point = self._approach(weights, gap)
        passes += point.passes
        undecided = self._undecided(weights, point)
        for _ in range(_MOST_SETTLES):
            if not undecided.size or point.gap <= _ROUNDING:
                break
            self._admit(undecided, point.g)
            point = self._approach(weights, 0.03 * point.gap)
            passes += point.passes
            undecided = self._undecided(weights, point)
        certified = point.gap <= gap
        return Solution(
            self._b.copy(), point.r, point.g, point.gap, certified, undecided, passes
        )

    def _approach(self, weights: Array, gap: float) -> _Pass:
        """Solve to the gap, or as far as it goes."""
        exactness, previous = 1.0, np.inf
        for passes in range(1, _MOST_PASSES + 1):
            point = self._pass(weights, passes)
            if point.gap <= gap:
                break
            new = self._admit(prox_blocks(self._b + point.g, weights).members, point.g)
            if not new and point.gap > 0.5 * previous:
                if exactness < _LEAST_EXACTNESS:
                    break
                exactness *= 0.1
            previous = point.gap
            coarse = max(0.3 * gap, min(1e-2, 0.05 * point.gap))
            self._refit(weights, exactness * coarse)
        return point

    def _undecided(self, weights: Array, point: _Pass) -> Indices:
        undecided = unsettled(self._b, point.g, weights)
        found = clusters(self._b)
        if found.starts.size > self._y.size:  # the optimum has no more clusters than runs
            undecided = np.union1d(undecided, found.members)
        return undecided

    def _pass(self, weights: Array, number: int) -> _Pass:
        on = self._held.indices
        r = self._y - self._held.columns @ self._b[on]
        g = self._X.T @ r
        penalty = sorted_penalty(self._b, weights)
        y_r, r_r = float(self._y @ r), float(r @ r)
        return _Pass(r, g, relative_gap(self._y_y, y_r, r_r, penalty, g, weights), number)

    def _admit(self, wanted: Indices, g: Array) -> int:
        """Take the most promising of the wanted columns in; return how many."""
        new = self._held.lacks(wanted)
        most = max(20, self._y.size // 4)
        if new.size > most:
            promise = np.abs(self._b + g)[new]
            new = new[np.argpartition(-promise, most)[:most]]
        if new.size:
            self._held.add(new)
        return int(new.size)

    def _refit(self, weights: Array, target: float) -> None:
        on = self._held.indices
        self._b[on] = minimise(
            self._held, self._y_y, self._y.size, weights, self._b[on], target
        )


def _descent(empty: float) -> list[float]:
    """Factors on the weights, from just below the least that empties the fit down to 1."""
    if empty <= 2.0:
        return []
    steps = int(np.ceil(np.log2(empty)))
    return [float(f) for f in np.geomspace(empty, 1.0, steps + 1)[1:-1]]
