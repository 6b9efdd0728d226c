"""The point of a boundary that stands in for a target out of its reach."""

import math
from collections.abc import Callable
from typing import Any

import numpy as np

from engine.limits.families import FAMILIES
from engine.limits.transition import power_limit
from engine.normal import Array
from engine.quantities import FDP, TPP

__all__ = ["KEEPING", "reachable_tpp"]

# What a stand-in keeps of the target.
KEEPING = ("tpp", "fdp", "nearest")

# Nodes a round, and how far each round narrows the stretch: five rounds reach 1e-5.
_NODES, _ROUNDS = 25, 4

# Below the lowest TPP that is looked at every boundary has an FDP that tends to 0 with it.
_LEAST = 1e-4


def reachable_tpp(
    penalty: str, tpp: Any, fdp: Any, sampling_ratio: Any, sparsity: Any, keeping: str
) -> float:
    """TPP of the point on a boundary that stands in for a target.

    A target within reach keeps its TPP. Asymptotic, for iid Gaussian columns.

    Parameters
    ----------
    penalty : str
        Key of the penalty in `FAMILIES`.
    tpp, fdp : float
        The target; a TPP in (0, 1], an FDP in (0, 1).
    sampling_ratio, sparsity : float
        As for the boundaries.
    keeping : str
        What the point keeps: 'tpp'; 'fdp', the largest TPP whose lowest FDP is at most that of
        the target; or 'nearest', the point at the least distance in the trade-off plane.

    Returns
    -------
    float
        In (0, 1], to 1e-5; nan where the penalty has no point at the TPP to keep.

    Raises
    ------
    ValueError
        If an argument is not in its interval, or a word is unknown.

    Examples
    --------
    >>> from engine.limits.nearest import reachable_tpp
    >>> round(reachable_tpp("lasso", 0.8, 0.5, 0.3, 0.2, "fdp"), 3)
    0.447
    """
    if penalty not in FAMILIES:
        raise ValueError(f"penalty must be one of {', '.join(FAMILIES)}, not {penalty!r}")
    if keeping not in KEEPING:
        raise ValueError(f"keeping must be one of {', '.join(KEEPING)}, not {keeping!r}")
    u, q = TPP.check(tpp), FDP.check(fdp)

    def boundary(at: Any) -> Any:
        return FAMILIES[penalty].boundary(at, sampling_ratio, sparsity)

    here = boundary(u)
    if keeping == "tpp" or here <= q:
        return math.nan if math.isnan(here) else u
    end = power_limit(sampling_ratio, sparsity) if penalty == "lasso" else 1.0
    end = min(u, end * (1.0 - 1e-9))  # the boundary rises: what lies right of u is further
    if keeping == "fdp":
        return _last_within(boundary, q, end)
    return _closest(boundary, u, q, end)


def _last_within(boundary: Callable[[Array], Array], q: float, high: float) -> float:
    """The last TPP up to `high` whose lowest FDP is at most q, or the least looked at."""
    low = _LEAST
    for _ in range(_ROUNDS):
        nodes = np.linspace(low, high, _NODES)
        beyond = np.flatnonzero(boundary(nodes) > q)
        if not len(beyond):
            return high
        first = max(int(beyond[0]), 1)
        low, high = float(nodes[first - 1]), float(nodes[first])
    return low


def _closest(boundary: Callable[[Array], Array], u: float, q: float, end: float) -> float:
    """The TPP at which the boundary is nearest to (u, q)."""
    low, high = _LEAST, end
    for _ in range(_ROUNDS):
        nodes = np.linspace(low, high, _NODES)
        best = int(np.argmin((nodes - u) ** 2 + (boundary(nodes) - q) ** 2))
        low, high = float(nodes[max(best - 1, 0)]), float(nodes[min(best + 1, _NODES - 1)])
    return float(nodes[best])
