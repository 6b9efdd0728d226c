"""Weights that fall with the rank, as [value, count] pairs: few enough to keep in a file.

Values have six digits. Where that makes too many pairs, they are first rounded to multiples of
a step, the finest that makes few enough: equal steps spread the error evenly over the weights.
"""

import math
from collections.abc import Callable, Iterator

import numpy as np

from engine.normal import Array

__all__ = ["MOST_RUNS", "run_lengths"]

# Two hundred points with this many pairs each, and texts as long as they may be, fit in a file
# that can be read again.
MOST_RUNS = 2000

Ranks = np.ndarray[tuple[int], np.dtype[np.int64]]


def run_lengths(profile: Callable[[Array], Array], candidates: int) -> list[tuple[float, int]]:
    """Return runs of equal weights, each as its value and its count, from the top rank down.

    Only the ranks around a change are looked at, so that a billion candidates take no longer
    than their runs do.

    Parameters
    ----------
    profile : callable
        Weight at the ranks that stand the shares r in (0, 1) from the top; nonincreasing.
    candidates : int
        Number of ranks; rank i stands the share (i + 1/2) / candidates from the top.

    Returns
    -------
    list of (float, int)
        At most `MOST_RUNS`; the values fall strictly, the counts sum to `candidates`.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.run_lengths import run_lengths
    >>> run_lengths(lambda shares: np.where(shares < 0.3, 2.0, 1.0), 2000)
    [(2.0, 600), (1.0, 1400)]
    """
    top = np.array([0.5 / candidates])
    for step in _steps(float(profile(top)[0])):
        starts, values = _runs(profile, candidates, step)
        if len(starts) <= MOST_RUNS:
            break
    counts = np.diff(starts, append=candidates)
    return list(zip(values.tolist(), counts.tolist(), strict=True))


def _steps(largest: float) -> Iterator[float]:
    """No step at all, then 1, 2 and 5 of the largest weight's sixth digit, fifth, and so on."""
    yield 0.0
    sixth = math.floor(math.log10(largest)) - 5
    for power in range(sixth, sixth + 6):
        for digit in (1, 2, 5):
            yield float(f"{digit}e{power}")


def _runs(
    profile: Callable[[Array], Array], candidates: int, step: float
) -> tuple[Ranks, Array]:
    """First rank and value of each run: all of them, or more than `MOST_RUNS`."""

    def values_at(ranks: Ranks) -> Array:
        weights = profile((ranks + 0.5) / candidates)
        return np.array([_rounded(weight, step) for weight in weights.tolist()])

    ranks = np.unique([0, candidates - 1])
    values = values_at(ranks)
    while True:
        changes = values[1:] != values[:-1]
        unseen = np.flatnonzero(changes & (ranks[1:] - ranks[:-1] > 1))
        if not unseen.size or np.count_nonzero(changes) >= MOST_RUNS:
            break
        between = (ranks[unseen] + ranks[unseen + 1]) // 2
        ranks = np.insert(ranks, unseen + 1, between)
        values = np.insert(values, unseen + 1, values_at(between))
    first = np.concatenate([[True], changes])
    return ranks[first], values[first]


def _rounded(weight: float, step: float) -> float:
    if step > 0.0:
        weight = round(weight / step) * step
    return float(f"{weight:.6g}")
