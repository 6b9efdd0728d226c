"""What every penalty family gives: its shrinkage at a zero threshold, its weights at finite p.

A path of a family is walked by its zero threshold alpha, in units of tau: estimates up to
alpha come out as 0. `Law` is the law of pi, the coefficients in units of tau.
"""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import NamedTuple, Protocol, runtime_checkable

import numpy as np

from engine.normal import Array, selection, tail

__all__ = ["Branched", "Law", "Penalty", "RankedWeights", "Shape", "Tuned", "largest_weight"]


RankedWeights = Callable[[Array, int], Array]


class Law(NamedTuple):
    """Coefficients in units of tau: sizes, and the share of the candidates at each."""

    sizes: Array
    masses: Array

    def beyond(self, x: Array) -> Array:
        """P(|pi + Z| > x), elementwise."""
        nulls = 2.0 * (1.0 - self.masses.sum()) * tail(x)
        return nulls + selection(self.sizes, np.asarray(x)[..., None]) @ self.masses  # type: ignore[no-any-return]


@dataclass(frozen=True, eq=False)
class Shape:
    """A shrinkage that a penalty has at a zero threshold.

    Attributes
    ----------
    risk, slope : float
        E (eta(pi + Z) - pi)^2 and E eta'(pi + Z).
    weights : callable
        Normalised weights at ranks 1 (the largest) to p, called with (ranks, p).
    admissible : bool
        False where no strength of the penalty has this zero threshold: a jump of its path.
    levels, share, ramp_level
        What the family chose or was told: two levels in units of tau and the share of the
        ranks with the larger; the level of a ramp.
    """

    risk: float
    slope: float
    weights: RankedWeights = field(repr=False)
    admissible: bool = True
    levels: tuple[float, float] | None = None
    share: float | None = None
    ramp_level: float | None = None


class Penalty(Protocol):
    """A family with its parameters."""

    @property
    def key(self) -> str:
        """The family's key in the registry."""
        ...

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage with this zero threshold on this law."""
        ...


@runtime_checkable
class Tuned(Penalty, Protocol):
    """A family whose parameters are chosen for the least risk at each zero threshold."""

    def tune(self, threshold: float, law: Law, near: Penalty | None) -> Penalty:
        """Return the best one; `near` is the best of a threshold or a law close by."""
        ...


@runtime_checkable
class Branched(Penalty, Protocol):
    """A family that can have a zero threshold in several ways, each smooth in tau."""

    @property
    def branches(self) -> tuple[Penalty, ...]:
        """The ways, of which at most one is admissible."""
        ...


def largest_weight(shape: Shape, candidates: int) -> float:
    """The largest of the normalised weights."""
    return float(shape.weights(np.ones(1), candidates)[0])
