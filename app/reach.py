"""What the Reach page shows, computed once per change and read by every picture and word."""

import math
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from engine import (
    critical_sparsity,
    power_limit,
)
from engine.limits.atlas import Atlas
from engine.limits.contours import Contours
from engine.limits.families import FAMILIES
from engine.limits.lasso_curve import lasso_curve
from engine.limits.two_level_closed_form import beyond_limit
from engine.normal import Array

__all__ = [
    "SEARCHED",
    "Curves",
    "Needs",
    "Reach",
    "Target",
    "exact",
    "exact_curves",
    "exact_reach",
    "stand_in",
    "swift_curves",
    "swift_needs",
    "swift_reach",
]

# Runs, candidates, actives, and the target's TPP and FDP.
Target = tuple[int, int, int, float, float]

# The penalties whose boundary is found by a search, too slow to follow the hand.
SEARCHED = ("two-level", "sorted-l1")

# Nodes in TPP below and above the power limit. The exact boundaries are evaluated on every
# second one: at the size of the plane the chords stray by less than a pixel.
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
class Needs:
    """The studies that can meet one target, drawn.

    Attributes
    ----------
    sparsity : ndarray
        Rising, up to that from which picking at random does.
    ratio : dict of str to ndarray
        By penalty, the least sampling ratio there.
    random_sparsity : float
        From here up picking at random meets the target.
    """

    sparsity: Array
    ratio: dict[str, Array]
    random_sparsity: float


@dataclass(frozen=True)
class Reach:
    """The limits of one study, and of one target on it.

    `lowest` is the FDP by penalty at the target's TPP, `ends` at TPP 1: nan where the penalty
    has no point, or is one of `SEARCHED` and not known yet. Until `exact` they are read off
    curves.
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

    def is_open(self, penalty: str) -> bool:
        """Whether nothing is known of the penalty yet."""
        return not self.exact and penalty in SEARCHED and math.isnan(self.lowest[penalty])

    def reaches(self, penalty: str) -> bool:
        """Whether some signal lets the penalty meet the target."""
        return bool(self.lowest[penalty] <= self.fdp)


def swift_reach(target: Target, curves: Curves | None = None) -> Reach:
    """Read the limits at a target off curves, to about 0.002.

    Those of `SEARCHED` stay open without exact curves of the same study.
    """
    runs, candidates, actives, tpp, fdp = target
    delta, eps = runs / candidates, actives / candidates
    if curves is None:
        curves = swift_curves(delta, eps)
    limit = power_limit(delta, eps)
    lowest = {key: float(np.interp(tpp, curves.tpp, fdp)) for key, fdp in curves.fdp.items()}
    ends = {key: float(fdp[-1]) for key, fdp in curves.fdp.items()}
    if limit <= tpp < 1.0 or limit < 1.0 == tpp:
        lowest["lasso"] = math.nan
    return Reach(
        runs=runs,
        candidates=candidates,
        actives=actives,
        tpp=tpp,
        fdp=fdp,
        critical_sparsity=critical_sparsity(delta),
        power_limit=limit,
        lowest=lowest,
        ends=ends,
        exact=False,
    )


def exact_reach(target: Target) -> Reach:
    """Evaluate every limit at a target."""
    swift = swift_reach(target)
    at_both = {
        key: family.boundary([swift.tpp, 1.0], *swift.study_ratios).tolist()
        for key, family in FAMILIES.items()
    }
    return replace(
        swift,
        lowest={key: both[0] for key, both in at_both.items()},
        ends={key: both[1] for key, both in at_both.items()},
        exact=True,
    )


def exact(target: Target) -> tuple[Reach, Curves]:
    """Evaluate the limits at a target and along TPP; this is what workers run."""
    reach = exact_reach(target)
    return reach, exact_curves(*reach.study_ratios)


def swift_curves(sampling_ratio: float, sparsity: float, atlas: Atlas | None = None) -> Curves:
    """Return the curves that need no search, and those of `SEARCHED` as the atlas has them."""
    below, above = _nodes(power_limit(sampling_ratio, sparsity))
    tpp = np.concatenate([below, above])
    u, q = lasso_curve(sampling_ratio, sparsity)
    lasso = np.interp(below, u[::-1], q[::-1])
    beyond = beyond_limit(above, sparsity, critical_sparsity(sampling_ratio))
    fdp = {
        "lasso": np.concatenate([lasso, np.full(len(above), np.nan)]),
        "two-level-closed-form": np.concatenate([lasso, beyond]),
    }
    if atlas is None:
        return Curves(tpp, fdp | {key: np.full(len(tpp), np.nan) for key in SEARCHED}, False)
    read = atlas.read_all(tpp, sampling_ratio, sparsity)
    ceiling = fdp["two-level-closed-form"]
    for key in SEARCHED:
        fdp[key] = ceiling = np.minimum(
            read[key], ceiling
        )  # the order of the curves is certain
    return Curves(tpp, fdp, exact=False)


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


def stand_in(
    curves: Curves, penalty: str, tpp: float, fdp: float, keeping: str
) -> tuple[float, float] | None:
    """Read off the curves the point that would be kept for a target out of reach.

    None for a target within reach, and where there is no such point; see
    `engine.limits.nearest`.
    """
    u, q = curves.tpp, curves.fdp[penalty]
    here = float(np.interp(tpp, u, q))
    if here <= fdp:
        return None
    if keeping == "tpp":
        return None if math.isnan(here) else (tpp, here)
    candidates = np.flatnonzero((u <= tpp) & ~np.isnan(q))
    if keeping == "fdp":
        last = candidates[q[candidates] <= fdp][-1]
        following = min(last + 1, candidates[-1])
        rise = q[following] - q[last]
        part = (fdp - q[last]) / rise if rise > 0.0 else 0.0
        return float(u[last] + part * (u[following] - u[last])), fdp
    away = (u[candidates] - tpp) ** 2 + (q[candidates] - fdp) ** 2
    nearest = candidates[int(np.argmin(away))]
    return float(u[nearest]), float(q[nearest])


def swift_needs(tpp: float, fdp: float, contours: Contours) -> Needs:
    """Return the studies that can meet a target, for drawing."""
    sparsity, ratio = contours.lines(tpp, fdp)
    return Needs(sparsity, ratio, 1.0 - fdp)


def _nodes(u_star: float) -> tuple[Array, Array]:
    """Nodes on either side of the power limit; above it they crowd where the curves bend."""
    if u_star < 1.0:
        above = u_star + (1.0 - u_star) * np.linspace(0.0, 1.0, _ABOVE + 1) ** 1.7
        return np.linspace(0.0, u_star, _BELOW + 1), above
    return np.linspace(0.0, 1.0, _BELOW + _ABOVE + 1), np.empty(0)
