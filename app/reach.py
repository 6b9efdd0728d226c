"""What the Reach page shows, computed once per change and read by every picture and word."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from engine import (
    critical_sparsity,
    power_limit,
    sorted_l1_boundary,
    two_level_boundary,
    two_level_closed_form,
)
from engine.limits.families import FAMILIES
from engine.limits.lasso_curve import lasso_curve
from engine.normal import Array

__all__ = ["Curves", "Reach", "exact_curves", "reach", "swift_curves"]

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
        Whether the two-level and sorted-L1 boundaries have been evaluated.
    """

    tpp: Array
    fdp: dict[str, Array]
    exact: bool


@dataclass(frozen=True)
class Reach:
    """The limits of one study, and of one target on it."""

    runs: int
    candidates: int
    actives: int
    tpp: float
    fdp: float
    critical_sparsity: float
    power_limit: float
    lowest: dict[str, float]  # FDP by penalty at the target's TPP; nan where it has no point
    ends: dict[str, float]  # the same at TPP 1

    @property
    def sampling_ratio(self) -> float:
        """Runs per candidate."""
        return self.runs / self.candidates

    @property
    def sparsity(self) -> float:
        """Actives per candidate."""
        return self.actives / self.candidates

    @property
    def random_fdp(self) -> float:
        """FDP of a list picked at random."""
        return 1.0 - self.sparsity

    def reaches(self, penalty: str) -> bool:
        """Whether some signal lets the penalty meet the target."""
        return bool(self.lowest[penalty] <= self.fdp)


@lru_cache(maxsize=512)
def reach(runs: int, candidates: int, actives: int, tpp: float, fdp: float) -> Reach:
    """Evaluate every limit at the target, exactly."""
    delta, eps = runs / candidates, actives / candidates
    at_both = {
        key: family.boundary([tpp, 1.0], delta, eps) for key, family in FAMILIES.items()
    }
    return Reach(
        runs=runs,
        candidates=candidates,
        actives=actives,
        tpp=tpp,
        fdp=fdp,
        critical_sparsity=critical_sparsity(delta),
        power_limit=power_limit(delta, eps),
        lowest={key: float(both[0]) for key, both in at_both.items()},
        ends={key: float(both[1]) for key, both in at_both.items()},
    )


def swift_curves(sampling_ratio: float, sparsity: float) -> Curves:
    """Return the curves that need no search; the others stay open."""
    u_star = power_limit(sampling_ratio, sparsity)
    below, above = _nodes(u_star)
    tpp = np.concatenate([below, above])
    u, q = lasso_curve(sampling_ratio, sparsity)
    lasso = np.interp(below, u[::-1], q[::-1])
    beyond = two_level_closed_form(above, sampling_ratio, sparsity)
    unknown = np.full(len(tpp), np.nan)
    return Curves(
        tpp,
        {
            "lasso": np.concatenate([lasso, np.full(len(above), np.nan)]),
            "two-level-closed-form": np.concatenate([lasso, beyond]),
            "two-level": unknown,
            "sorted-l1": unknown,
        },
        exact=False,
    )


@lru_cache(maxsize=256)
def exact_curves(sampling_ratio: float, sparsity: float) -> Curves:
    """Return every curve, the two searched ones included: some 0.2 seconds when cold."""
    swift = swift_curves(sampling_ratio, sparsity)
    below, above = _nodes(power_limit(sampling_ratio, sparsity))
    searched = {
        key: np.concatenate(
            [_along(boundary, side, sampling_ratio, sparsity) for side in (below, above)]
        )
        for key, boundary in (
            ("two-level", two_level_boundary),
            ("sorted-l1", sorted_l1_boundary),
        )
    }
    return Curves(swift.tpp, {**swift.fdp, **searched}, exact=True)


def _nodes(u_star: float) -> tuple[Array, Array]:
    if u_star < 1.0:
        return np.linspace(0.0, u_star, _BELOW + 1), np.linspace(u_star, 1.0, _ABOVE + 1)
    return np.linspace(0.0, 1.0, _BELOW + _ABOVE + 1), np.empty(0)


def _along(boundary: object, tpp: Array, sampling_ratio: float, sparsity: float) -> Array:
    """Evaluate `boundary` on every second node and join the points by chords."""
    if not len(tpp):
        return tpp
    nodes = tpp[::2]
    positive = nodes > 0.0
    fdp = np.zeros(len(nodes))  # every boundary starts at FDP 0
    fdp[positive] = boundary(nodes[positive], sampling_ratio, sparsity)
    return np.interp(tpp, nodes, fdp)
