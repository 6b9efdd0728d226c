"""What the Reach page shows, computed once per change and read by every picture and word."""

import math
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

import numpy as np

from engine import (
    critical_sparsity,
    power_limit,
    two_level_closed_form,
)
from engine.limits.families import FAMILIES
from engine.limits.lasso_curve import lasso_curve
from engine.limits.two_level_closed_form import beyond_limit
from engine.normal import Array

__all__ = [
    "SEARCHED",
    "Curves",
    "Reach",
    "exact",
    "exact_curves",
    "exact_reach",
    "read_off",
    "swift_curves",
    "swift_reach",
]

# The penalties whose boundary is found by a search, too slow to follow the hand.
SEARCHED = ("two-level", "sorted-l1")

# Nodes in TPP below and above the power limit. The exact boundaries are evaluated on every
# second one: at the size of the plane the chords stray by less than half a pixel.
_BELOW, _ABOVE = 64, 32


@dataclass(frozen=True)
class Curves:
    """The boundaries of one study along TPP.

    Attributes
    ----------
    tpp : ndarray
        Nodes from 0 to 1; a power limit below 1 stands twice, once for each side.
    fdp : dict of str to ndarray
        Lowest FDP by penalty; nan where the penalty has no point or none is known yet.
    exact : bool
        Whether the two searched boundaries have been evaluated.
    """

    tpp: Array
    fdp: dict[str, Array]
    exact: bool


@dataclass(frozen=True)
class Reach:
    """The limits of one study, and of one target on it.

    `lowest` is the FDP by penalty at the target's TPP: nan where the penalty has no point, or
    while `exact` is False and the penalty is one of `SEARCHED`. `ends` is the same at TPP 1.
    """

    runs: int
    candidates: int
    actives: int
    tpp: float
    fdp: float
    critical_sparsity: float
    power_limit: float
    lowest: dict[str, float]
    ends: dict[str, float]
    exact: bool

    @property
    def sampling_ratio(self) -> float:
        """Runs per candidate."""
        return self.runs / self.candidates

    @property
    def sparsity(self) -> float:
        """Actives per candidate."""
        return self.actives / self.candidates

    @property
    def study_ratios(self) -> tuple[float, float]:
        """Sampling ratio and sparsity: all that the boundaries depend on."""
        return self.sampling_ratio, self.sparsity

    @property
    def random_fdp(self) -> float:
        """FDP of a list picked at random."""
        return 1.0 - self.sparsity

    def reaches(self, penalty: str) -> bool:
        """Whether some signal lets the penalty meet the target."""
        return bool(self.lowest[penalty] <= self.fdp)


def swift_reach(runs: int, candidates: int, actives: int, tpp: float, fdp: float) -> Reach:
    """Evaluate the limits that need no search; those of `SEARCHED` stay open."""
    delta, eps = runs / candidates, actives / candidates
    limit = power_limit(delta, eps)
    both = two_level_closed_form([tpp, 1.0], delta, eps).tolist()
    # Below its limit the lasso is the closed form; at a limit below 1 it ends.
    lasso = [
        q if limit == 1.0 or u < limit else math.nan
        for u, q in zip((tpp, 1.0), both, strict=True)
    ]
    open_ = dict.fromkeys(SEARCHED, math.nan)
    return Reach(
        runs=runs,
        candidates=candidates,
        actives=actives,
        tpp=tpp,
        fdp=fdp,
        critical_sparsity=critical_sparsity(delta),
        power_limit=limit,
        lowest={"lasso": lasso[0], "two-level-closed-form": both[0], **open_},
        ends={"lasso": lasso[1], "two-level-closed-form": both[1], **open_},
        exact=False,
    )


def read_off(reach: Reach, curves: Curves) -> Reach:
    """Fill the open values of `reach` from exact curves of the same study, to about 0.002."""
    lowest, ends = dict(reach.lowest), dict(reach.ends)
    for key in SEARCHED:
        lowest[key] = float(np.interp(reach.tpp, curves.tpp, curves.fdp[key]))
        ends[key] = float(curves.fdp[key][-1])
    return replace(reach, lowest=lowest, ends=ends)


def exact_reach(runs: int, candidates: int, actives: int, tpp: float, fdp: float) -> Reach:
    """Evaluate every limit at the target."""
    swift = swift_reach(runs, candidates, actives, tpp, fdp)
    found = {
        key: FAMILIES[key].boundary([tpp, 1.0], swift.sampling_ratio, swift.sparsity).tolist()
        for key in SEARCHED
    }
    return replace(
        swift,
        lowest={**swift.lowest, **{key: both[0] for key, both in found.items()}},
        ends={**swift.ends, **{key: both[1] for key, both in found.items()}},
        exact=True,
    )


def exact(*target: Any) -> tuple[Reach, Curves]:
    """Evaluate the limits at a target and along TPP; this is what workers run."""
    reach = exact_reach(*target)
    return reach, exact_curves(*reach.study_ratios)


def swift_curves(sampling_ratio: float, sparsity: float) -> Curves:
    """Return the curves that need no search; the others stay open."""
    below, above = _nodes(power_limit(sampling_ratio, sparsity))
    tpp = np.concatenate([below, above])
    u, q = lasso_curve(sampling_ratio, sparsity)
    lasso = np.interp(below, u[::-1], q[::-1])
    beyond = beyond_limit(above, sparsity, critical_sparsity(sampling_ratio))
    unknown = np.full(len(tpp), np.nan)
    return Curves(
        tpp,
        {
            "lasso": np.concatenate([lasso, unknown[len(below) :]]),
            "two-level-closed-form": np.concatenate([lasso, beyond]),
            **dict.fromkeys(SEARCHED, unknown),
        },
        exact=False,
    )


@lru_cache(maxsize=256)
def exact_curves(sampling_ratio: float, sparsity: float) -> Curves:
    """Return every curve, the two searched ones included: some 0.1 seconds when cold."""
    swift = swift_curves(sampling_ratio, sparsity)
    sides = _nodes(power_limit(sampling_ratio, sparsity))
    nodes = np.concatenate([side[::2] for side in sides])
    split = len(sides[0][::2])
    positive = np.maximum(nodes, 1e-6)  # every boundary starts at FDP 0
    fdp = dict(swift.fdp)
    for key in SEARCHED:
        at_nodes = FAMILIES[key].boundary(positive, sampling_ratio, sparsity)
        parts = zip(sides, np.split(nodes, [split]), np.split(at_nodes, [split]), strict=True)
        fdp[key] = np.concatenate([np.interp(*part) for part in parts if len(part[0])])
    return Curves(swift.tpp, fdp, exact=True)


def _nodes(u_star: float) -> tuple[Array, Array]:
    if u_star < 1.0:
        return np.linspace(0.0, u_star, _BELOW + 1), np.linspace(u_star, 1.0, _ABOVE + 1)
    return np.linspace(0.0, 1.0, _BELOW + _ABOVE + 1), np.empty(0)
