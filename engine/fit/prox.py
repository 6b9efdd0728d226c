r"""The proximal map of the sorted-L1 norm, and the clusters it makes.

    prox(v) = argmin_x  1/2 ||v - x||^2 + sum_i lambda_i |x|_(i),   |x|_(1) >= |x|_(2) >= ...

It keeps signs and order, so it is a nonincreasing isotonic regression of |v| - lambda, largest
first, clipped at 0 (formula from memory, verified by a generic convex solver). Zeros are exact,
and so are ties: candidates pooled by the regression get the same number.
"""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import isotonic_regression

from engine.normal import Array

__all__ = ["Blocks", "Indices", "clusters", "prox", "prox_blocks"]

Indices = np.ndarray[tuple[int], np.dtype[np.intp]]


@dataclass(frozen=True)
class Blocks:
    """The nonzero clusters of a vector, in order of falling size.

    Attributes
    ----------
    members : ndarray of int
        Positions of the nonzero entries, cluster after cluster.
    signs : ndarray
        Sign of each member.
    starts : ndarray of int
        Where in `members` each cluster begins.
    """

    members: Indices
    signs: Array
    starts: Indices

    @property
    def sizes(self) -> Indices:
        """Members of each cluster."""
        return np.diff(self.starts, append=self.members.size)

    def sums(self, values: Array) -> Array:
        """Sum over each cluster of one value a member."""
        if self.starts.size == self.members.size:
            return values
        return np.add.reduceat(values, self.starts)


def prox(v: Array, weights: Array) -> Array:
    """Return the proximal map at `v`; the weights are nonincreasing and nonnegative.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.fit.prox import prox
    >>> prox(np.array([3.0, -2.9, 1.0]), np.array([2.0, 1.0, 1.0])).round(3).tolist()
    [1.45, -1.45, 0.0]
    """
    sizes = np.abs(v)
    if weights[0] == weights[-1]:  # the lasso: no candidate's weight depends on its rank
        left = sizes - weights[0]
    else:
        left = np.empty_like(v)
        order = np.argsort(-sizes)
        left[order] = isotonic_regression(sizes[order] - weights, increasing=False).x
    result: Array = np.copysign(np.maximum(left, 0.0), v) + 0.0  # + 0.0 turns -0.0 into 0.0
    return result


def prox_blocks(v: Array, weights: Array) -> Blocks:
    """Return the nonzero clusters of the proximal map at `v`."""
    sizes = np.abs(v)
    if weights[0] == weights[-1]:
        members = np.flatnonzero(sizes > weights[0])
        starts = np.arange(members.size)
    else:
        order = np.argsort(-sizes)
        pooled = isotonic_regression(sizes[order] - weights, increasing=False)
        starts = pooled.blocks[:-1]
        members = order[: np.count_nonzero(pooled.x > 0.0)]
        starts = starts[starts < members.size]
    return Blocks(members, np.sign(v[members]), starts)


def clusters(b: Array) -> Blocks:
    """Return the nonzero clusters of `b` itself: entries of exactly the same magnitude."""
    sizes = np.abs(b)
    order = np.argsort(-sizes, kind="stable")
    members = order[: np.count_nonzero(sizes)]
    ordered = sizes[members]
    first = np.ones(members.size, dtype=bool)
    first[1:] = ordered[1:] != ordered[:-1]
    return Blocks(members, np.sign(b[members]), np.flatnonzero(first))
