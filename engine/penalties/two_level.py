"""Two levels: the larger weight on the top share of the ranks, the smaller on the rest.

Source: *Sharp trade-offs in high-dimensional inference via 2-level SLOPE*, arXiv 2507.09110,
2025; the shrinkage and its moments are those of engine/limits/two_level_moments.py.
"""

from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import brentq

from engine.limits.two_level_moments import null_risk_and_slope, risk_and_slope
from engine.normal import Array, density, tail
from engine.penalties.lasso import Lasso
from engine.penalties.penalty import Law, Penalty, Shape

__all__ = ["Pieces", "TunedTwoLevel", "TwoLevel", "moments", "upper_share"]

_REACH = 8.0  # standard deviations past the largest effect: nothing lies beyond


def moments(b: float, gap: Array, h: Array, law: Law) -> tuple[Array, Array]:
    """Return risk and E eta' of shrinkages with lower level b on a law, elementwise."""
    sizes = law.sizes.reshape((-1,) + (1,) * np.ndim(gap))
    lower = np.asarray(b)
    risks, slopes = risk_and_slope(sizes, lower, gap, h)
    null_risks, null_slopes = null_risk_and_slope(lower, gap, h)
    nulls = 1.0 - law.masses.sum()
    return (
        nulls * null_risks + np.tensordot(law.masses, risks, 1),
        nulls * null_slopes + np.tensordot(law.masses, slopes, 1),
    )


def upper_share(b: float, gap: float, h: float, law: Law) -> float:
    """Share of the ranks that has the upper level for this shrinkage to come about.

    Over the flat stretch the mean of the weights equals the mean of |x| - h.
    """
    if gap <= 0.0:
        return 1.0
    centres = np.concatenate([[0.0], law.sizes])
    masses = np.concatenate([[1.0 - law.masses.sum()], law.masses])
    start = b + h + np.stack([-centres, centres])
    end = start + gap
    pooled = density(start) - density(end) - start * (tail(start) - tail(end))
    return float(((pooled / gap + tail(end)) @ masses).sum())


def _shape(b: float, gap: float, h: float, share: float, law: Law) -> Shape:
    risk, slope = moments(b, np.asarray(gap), np.asarray(h), law)
    return Shape(
        float(risk),
        float(slope),
        lambda ranks, p: np.where((ranks - 0.5) / p < share, b + gap, b),
        levels=(b + gap, b),
        share=share,
    )


@dataclass(frozen=True)
class TwoLevel:
    """Two levels in a stated proportion, on a stated share of the ranks.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.penalties.penalty import Law
    >>> from engine.penalties.two_level import TwoLevel
    >>> law = Law(np.array([2.0]), np.array([0.2]))
    >>> TwoLevel(2.0, 1.0, 0.2).shape(0.8, law).levels
    (1.6, 0.8)
    """

    upper: float
    lower: float
    share: float
    key: str = "two-level"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage with this zero threshold, on either branch."""
        lower, upper = (branch.shape(threshold, law) for branch in self.branches)
        return lower if lower.admissible else upper

    @property
    def branches(self) -> tuple[Penalty, Penalty]:
        """The two ways to have a zero threshold: at the lower level, or at the upper one."""
        return _AtLower(self), _AtUpper(self)

    def shape_at_lower(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage whose lower level is the threshold.

        Its flat stretch has the height h >= 0 that the share sets; a share too large for any
        is not admissible.
        """
        if self.lower == 0.0:
            return replace(self.shape_at_upper(threshold, law), admissible=threshold == 0.0)
        gap = threshold * (self.upper / self.lower - 1.0)
        if gap == 0.0 or self.share == 1.0:
            return self._named(Lasso().shape(threshold, law), threshold)
        reached = upper_share(threshold, gap, 0.0, law) >= self.share
        h = self._height(threshold, gap, law) if reached else 0.0
        return replace(_shape(threshold, gap, h, self.share, law), admissible=reached)

    def shape_at_upper(self, threshold: float, law: Law) -> Shape:
        """Return soft thresholding at the upper level.

        It comes about when the flat stretch would lie below 0: nothing of the lower level but
        zeros is left.
        """
        lower = threshold * self.lower / self.upper
        soft = self._named(Lasso().shape(threshold, law), threshold)
        flat = upper_share(lower, threshold - lower, 0.0, law)
        return replace(soft, admissible=flat <= self.share)

    def _height(self, b: float, gap: float, law: Law) -> float:
        end = float(law.sizes.max()) + _REACH

        def surplus(h: float) -> float:
            return upper_share(b, gap, h, law) - self.share

        if surplus(end) >= 0.0:  # a share below every rank there is
            return end
        return float(brentq(surplus, 0.0, end, xtol=1e-12))

    def _named(self, soft: Shape, upper: float) -> Shape:
        levels = (upper, upper * self.lower / self.upper)

        def weights(ranks: Array, p: int) -> Array:
            return np.where((ranks - 0.5) / p < self.share, *levels)

        return replace(soft, weights=weights, levels=levels, share=self.share)


@dataclass(frozen=True)
class _AtLower:
    two_level: TwoLevel
    key: str = "two-level"

    def shape(self, threshold: float, law: Law) -> Shape:
        return self.two_level.shape_at_lower(threshold, law)


@dataclass(frozen=True)
class _AtUpper:
    two_level: TwoLevel
    key: str = "two-level"

    def shape(self, threshold: float, law: Law) -> Shape:
        return self.two_level.shape_at_upper(threshold, law)


@dataclass(frozen=True)
class Pieces:
    """Two levels given by their shrinkage: gap of the levels, height of the flat stretch."""

    gap: float
    height: float
    key: str = "two-level"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage; the share of the larger level follows from the law."""
        share = upper_share(threshold, self.gap, self.height, law)
        return _shape(threshold, self.gap, self.height, share, law)


# The first look at gaps and heights, and how often the neighbourhood of the best is zoomed.
_COARSE, _FINE, _ZOOMS = 12, 5, 10
_GAPS: Array = np.concatenate([[0.0], np.geomspace(0.05, 10.0, _COARSE - 1)])
_OVER = 1e3  # outweighs any risk: a fit with more distinct sizes than runs does not exist


@dataclass(frozen=True)
class TunedTwoLevel:
    """The two levels and the share of least risk at each zero threshold.

    `delta` is the sampling ratio, which E eta' must not pass.
    """

    delta: float
    key: str = "two-level"

    def tune(self, threshold: float, law: Law, near: Penalty | None) -> Pieces:
        """Return the two-level shrinkage of least risk with this zero threshold."""
        # There are two valleys, of narrow gaps and of gaps so wide that they cap the estimates:
        # each strength is looked at afresh, so that none is followed into the wrong one.
        spacing = (float(law.sizes.max()) + 3.0) / (_COARSE - 1)
        heights = np.linspace(0.0, spacing * (_COARSE - 1), _COARSE)
        best = self._best(threshold, _GAPS, heights, law)
        steps = np.array([max(0.5, 0.4 * best[0]), spacing])
        if isinstance(near, Pieces):
            gaps, heights = np.array([best, (near.gap, near.height)]).T
            if self._losses(threshold, gaps, heights, law).argmin() == 1:
                best, steps = (near.gap, near.height), np.minimum(steps, 0.25)
        for _ in range(_ZOOMS):
            around = np.linspace(-1.0, 1.0, _FINE)
            nearby_gaps = np.maximum(best[0] + steps[0] * around, 0.0)
            nearby_heights = np.maximum(best[1] + steps[1] * around, 0.0)
            best = self._best(threshold, nearby_gaps, nearby_heights, law)
            steps *= 0.6
        return Pieces(*best)

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage of least risk."""
        return self.tune(threshold, law, None).shape(threshold, law)

    def _best(self, b: float, gaps: Array, heights: Array, law: Law) -> tuple[float, float]:
        gap, h = np.meshgrid(gaps, heights)
        i = int(np.argmin(self._losses(b, gap, h, law)))
        return float(gap.flat[i]), float(h.flat[i])

    def _losses(self, b: float, gap: Array, h: Array, law: Law) -> Array:
        risk, slope = moments(b, gap, h, law)
        loss: Array = risk + _OVER * np.maximum(slope - self.delta, 0.0)
        return loss
