"""The lasso: one weight for all ranks, soft thresholding in the limit, closed forms."""

from dataclasses import dataclass

import numpy as np

from engine.normal import Array, null_risk, selection, soft_risk, tail
from engine.penalties.penalty import Law, Shape

__all__ = ["Lasso", "soft_moments"]


def soft_moments(threshold: Array, sizes: Array, masses: Array) -> tuple[Array, Array]:
    """Return risk and E eta' of soft thresholding; the atoms lie along the last axis."""
    nulls = 1.0 - masses.sum()
    at = threshold[..., None]
    risk = nulls * null_risk(threshold) + soft_risk(sizes, at) @ masses
    return risk, 2.0 * nulls * tail(threshold) + selection(sizes, at) @ masses


@dataclass(frozen=True)
class Lasso:
    """Equal weights.

    Source: *The LASSO risk for Gaussian matrices*, IEEE Trans. Inf. Theory 58(4), 2012.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.penalties.lasso import Lasso
    >>> from engine.penalties.penalty import Law
    >>> shape = Lasso().shape(1.6, Law(np.array([3.0]), np.array([0.1])))
    >>> round(shape.risk, 4), shape.weights(np.array([1, 3]), 3).tolist()
    (0.3628, [1.6, 1.6])
    """

    key: str = "lasso"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return soft thresholding on this law."""
        risk, slope = soft_moments(np.asarray(threshold), law.sizes, law.masses)
        return Shape(
            float(risk), float(slope), lambda ranks, p: np.full(ranks.shape, threshold)
        )
