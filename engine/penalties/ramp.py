"""The ramp: weights proportional to the critical values of Benjamini and Hochberg's procedure.

Source: *SLOPE: adaptive variable selection via convex optimization*, Annals of Applied
Statistics 9(3), 2015: lambda_i = Phi^-1(1 - q i / (2 p)) at level q.
"""

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from engine.limits.least_risk import Folded, fold
from engine.normal import Array
from engine.penalties.penalty import Law, Penalty, Shape
from engine.penalties.profile import profile_shape

__all__ = ["Ramp", "TunedRamp", "critical_values"]


def critical_values(level: float, ranks: Array, candidates: int) -> Array:
    """Return the critical values at ranks from 1, the largest, on.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.penalties.ramp import critical_values
    >>> critical_values(0.1, np.array([1, 10, 100, 1000]), 1000).round(5).tolist()
    [3.89059, 3.29053, 2.57583, 1.64485]
    """
    values: Array = np.abs(ndtri(0.5 * level * ranks / candidates))
    return values


@dataclass(frozen=True)
class Ramp:
    """Ramped weights of one level."""

    level: float
    key: str = "ramp"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage with this zero threshold."""
        return self.shape_on(threshold, law, None)

    def shape_on(self, threshold: float, law: Law, folded: Folded | None) -> Shape:
        """Return the same where the law has been folded at the threshold already."""
        return profile_shape(
            threshold,
            law,
            lambda r: np.abs(ndtri(np.clip(0.5 * self.level * r, 1e-300, 0.5))),
            lambda ranks, p: critical_values(self.level, ranks, p),
            self.level,
            folded,
        )


# Ends of the levels searched, as log10, and how close the search comes. Levels that tend to 0
# tend to equal weights, as slowly as the normal quantile flattens.
_LOW, _HIGH = -8.0, -0.005
_FIRST = (-8.0, -4.0, -2.0, -1.3, -1.0, -0.7, -0.5, -0.35, -0.2, -0.1, -0.005)
_STRIDE, _CLOSE = 0.3, 0.01


@dataclass(frozen=True)
class TunedRamp:
    """Ramped weights of the level of least risk at each zero threshold."""

    key: str = "ramp"

    def tune(self, threshold: float, law: Law, near: Penalty | None) -> Ramp:
        """Return the admissible ramp of least risk with this zero threshold."""

        folded = fold(threshold, law.sizes.tolist(), law.masses.tolist())

        def cost(exponent: float) -> tuple[bool, float]:
            shape = Ramp(10.0**exponent).shape_on(threshold, law, folded)
            return not shape.admissible, shape.risk

        if isinstance(near, Ramp):
            best, stride = float(np.log10(near.level)), _STRIDE / 8.0
            least = cost(best)
        else:
            least, best = min((cost(exponent), exponent) for exponent in _FIRST)
            stride = _STRIDE
        while stride > _CLOSE:
            nearby = [max(best - stride, _LOW), min(best + stride, _HIGH)]
            value, exponent = min((cost(e), e) for e in nearby)
            if value < least:
                best, least = exponent, value
            else:
                stride *= 0.4
        return Ramp(10.0**best)

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage of the ramp of least risk."""
        return self.tune(threshold, law, None).shape(threshold, law)
