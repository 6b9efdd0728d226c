r"""The fit on the working set, wholly in terms of its Gram matrix G and c = X_W'y.

Two moves alternate. A *cluster step* takes the clusters and signs of prox_{t lambda}(x + t h),
h = c - G x, as if they were those of the optimum, and solves the linear equations they leave:
with the signed cluster matrix U, (U'G U) u = U'c - (sum of the weights of each cluster).
Where that does not help, a *burst* of accelerated proximal gradient steps with restart finds
better clusters; once bursts have to grow, a cluster step on the point's own clusters follows
each, shortened until the objective falls, which it must: correlated designs need it.
"""

from dataclasses import dataclass

import numpy as np
from scipy.linalg import LinAlgError, cho_factor, cho_solve
from scipy.sparse import csr_array

from engine.fit.certificate import relative_gap, sorted_penalty
from engine.fit.gram import Matrix, WorkingSet
from engine.fit.prox import Blocks, clusters, prox, prox_blocks
from engine.normal import Array

__all__ = ["minimise"]

# The step t with which clusters are guessed, in units of a unit-length column's curvature.
_STEP = 3.0
# Cluster steps that lower the gap but not the objective: without a limit they go in circles.
_LENIENT = 8
_SHORTEST_BURST, _LONGEST_BURST = 15, 100
_MOST_STALE = 50  # moves in a row that bring no smaller gap
_ROUNDING = 1e-12  # of the objective, in units of ||y||^2
_MOST_HALVINGS = 20
# Added to U'G U where its clusters may be more than the runs; columns are of length one.
_RIDGE = 1e-6
# From this gap on a burst comes first: the clusters of a fit further off are not worth a guess.
_FAR = 1e-3


@dataclass(frozen=True)
class _Point:
    x: Array
    h: Array  # X_W'(y - X_W x)
    primal: float
    gap: float


class _Restricted:
    """Sorted L1 on the working set with the largest weights."""

    def __init__(self, held: WorkingSet, y_y: float, runs: int, weights: Array) -> None:
        self.gram: Matrix = held.gram
        self.c = held.c
        self.y_y = y_y
        self.runs = runs
        self.weights = weights[: held.c.size]
        self.curvature = 1.02 * held.norm

    def at(self, x: Array, h: Array | None = None) -> _Point:
        if h is None:
            h = self.c - self.gram @ x
        y_r = self.y_y - float(self.c @ x)
        r_r = max(0.0, y_r - float(x @ h))
        penalty = sorted_penalty(x, self.weights)
        gap = relative_gap(self.y_y, y_r, r_r, penalty, h, self.weights)
        return _Point(x, h, 0.5 * r_r + penalty, gap)

    def guess(self, point: _Point) -> Blocks:
        """The clusters of a long proximal gradient step from `point`."""
        return prox_blocks(point.x + _STEP * point.h, _STEP * self.weights)

    def cluster_step(self, blocks: Blocks, near: Array | None = None) -> _Point | None:
        """The optimum were these its clusters; None where their equations have no solution.

        With `near`, a point that has these clusters, the optimum less far from it than others
        that are as good, so that there is one even for more clusters than runs.
        """
        if not blocks.starts.size or (near is None and blocks.starts.size > self.runs):
            return None
        members = blocks.members
        matrix, right = self._equations(blocks)
        if near is not None:
            matrix[np.diag_indices_from(matrix)] += _RIDGE
            right = right + _RIDGE * np.abs(near[members[blocks.starts]])
        try:
            # Symmetric, so its transpose is the column-major form that saves a copy.
            factor = cho_factor(matrix.T, lower=True, overwrite_a=True, check_finite=False)
        except LinAlgError:
            return None
        sizes = cho_solve(factor, right, check_finite=False)
        x = np.zeros_like(self.c)
        x[members] = blocks.signs * np.repeat(sizes, blocks.sizes)
        return self.at(x)

    def _equations(self, blocks: Blocks) -> tuple[Matrix, Array]:
        """Both sides of the equations of a cluster step."""
        members, signs = blocks.members, blocks.signs
        right = blocks.sums(signs * self.c[members] - self.weights[: members.size])
        if blocks.starts.size == members.size:
            matrix = self.gram[np.ix_(members, members)]
            matrix *= signs
            matrix *= signs[:, None]
            return matrix, right
        ends = np.append(blocks.starts, members.size)
        U = csr_array((signs, members, ends), shape=(blocks.starts.size, self.c.size))
        return U @ np.ascontiguousarray((U @ self.gram).T), right

    def descend(self, point: _Point) -> _Point:
        """Towards the optimum for the clusters of `point` itself, as far as that helps."""
        proposal = self.cluster_step(clusters(point.x), point.x)
        if proposal is None:
            return point
        for _ in range(_MOST_HALVINGS):
            if proposal.primal < point.primal:
                return proposal
            x, h = 0.5 * (point.x + proposal.x), 0.5 * (point.h + proposal.h)
            proposal = self.at(x, h)
        return point

    def burst(self, point: _Point, length: int) -> _Point:
        """Accelerated proximal gradient steps, restarted whenever they turn back."""
        x = z = point.x
        h = point.h
        momentum = 1.0
        step = 1.0 / self.curvature
        weights = step * self.weights
        for _ in range(length):
            new = prox(z + step * h, weights)
            moved = new - x
            if (z - new) @ moved > 0.0:
                momentum = 1.0
            following = 0.5 * (1.0 + np.sqrt(1.0 + 4.0 * momentum * momentum))
            z = new + ((momentum - 1.0) / following) * moved
            h = self.c - self.gram @ z
            x, momentum = new, following
        after = self.at(x)
        if after.primal > point.primal + _ROUNDING * self.y_y:  # the steps were too long
            self.curvature *= 1.5
        return after


def minimise(
    held: WorkingSet, y_y: float, runs: int, weights: Array, start: Array, target: float
) -> Array:
    """Return a fit on the working set whose relative gap there is `target` at most.

    A point that is as good as rounding allows, or as good as it gets before moves stop
    helping, is returned all the same: the caller certifies it on the whole design.
    """
    problem = _Restricted(held, y_y, runs, weights)
    point = best = problem.at(start)
    lenient, length = _LENIENT, _SHORTEST_BURST
    if point.gap > _FAR:
        point = problem.burst(point, length)
        best = min(best, point, key=lambda p: p.gap)
    stale = 0
    while best.gap > target and stale < _MOST_STALE:
        proposal = problem.cluster_step(problem.guess(point))
        if proposal is not None and proposal.primal < point.primal:
            point = proposal
        elif proposal is not None and lenient and proposal.gap < point.gap:
            lenient -= 1
            point = proposal
        else:
            point = problem.burst(point, length)
            if length > 2 * _SHORTEST_BURST:
                point = problem.descend(point)
            length = min(_LONGEST_BURST, length * 3 // 2)
        stale = 0 if point.gap < best.gap else stale + 1
        best = min(best, point, key=lambda p: p.gap)
    return best.x
