"""A witness: the law of effects and the penalty that attain a point of a boundary.

Units: tau, the effective noise of the fit (noise plus what the misfit adds); a size of 3 is an
effect whose estimate before shrinkage lies 3 tau from 0. As the noise tends to 0, a fit with
these weights on data with this law tends to the point.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from engine.normal import Array

__all__ = ["Law", "Witness"]


@dataclass(frozen=True)
class Law:
    """Sizes of the actives in units of tau, and the share of the actives at each.

    A size of 0 stands for effects that tend to 0, infinity for effects that outgrow tau.
    """

    sizes: tuple[float, ...]
    shares: tuple[float, ...]


@dataclass(frozen=True)
class Witness:
    """What attains, or is only approached by, the lowest FDP of a penalty at a TPP.

    Attributes
    ----------
    penalty : str
        'lasso', 'two-level' or 'sorted-l1'.
    tpp, fdp, sampling_ratio, sparsity : float
        The point and its study.
    zero_threshold : float
        Estimates below it, in units of tau, are set to 0.
    law : Law
        The effects of the actives.
    risk : float
        Mean squared error per candidate in units of tau^2; the sampling ratio when the
        boundary is met with equality.
    slope : float
        E eta', the limit of (distinct nonzero magnitudes) / candidates of the fit.
    smallest_selected : float
        eta(zero_threshold + 0.1): how large an estimate just past the threshold comes out.
    profile : callable
        Normalised weight at the ranks that stand the shares r in (0, 1) from the top.
    levels : tuple of float or None
        The two levels of a two-level penalty, the larger first.
    level_share : float or None
        Share of the ranks that has the larger level.
    """

    penalty: str
    tpp: float
    fdp: float
    sampling_ratio: float
    sparsity: float
    zero_threshold: float
    law: Law
    risk: float
    slope: float
    smallest_selected: float
    profile: Callable[[Array], Array] = field(repr=False, compare=False)
    levels: tuple[float, float] | None = None
    level_share: float | None = None

    @property
    def calibration(self) -> float:
        """1 - E eta' / sampling ratio: weights over (tau times the normalised weights)."""
        return max(1.0 - self.slope / self.sampling_ratio, 0.0)

    @property
    def approached(self) -> str:
        """Why the point is only approached; empty where it is attained."""
        if self.calibration < LEAST_CALIBRATION:
            return "the weights tend to 0: the fit tends to as many distinct sizes as runs"
        if not all(0.0 < size < np.inf for size in self.law.sizes):
            return "some effects have to tend to 0 or to outgrow the noise"
        return ""

    @property
    def resolved(self) -> bool:
        """Whether selections just past the threshold are large enough to count at finite p."""
        return self.smallest_selected >= LEAST_RESOLVED

    def normalised_weights(self, candidates: int) -> Array:
        """Nonincreasing weights at finite p; times tau and the calibration, those of the fit.

        Parameters
        ----------
        candidates : int
            Number of weights, p.

        Returns
        -------
        ndarray, shape (candidates,)
        """
        return self.profile((np.arange(candidates) + 0.5) / candidates)


# A calibration this small is 0 up to the accuracy to which the boundary is solved.
LEAST_CALIBRATION = 1e-4

# Estimates below a thousandth of tau are lost in the rounding of any practical fit.
LEAST_RESOLVED = 1e-3
