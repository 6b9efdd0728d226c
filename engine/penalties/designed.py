"""The designed penalty: of all sorted-L1 shrinkages with a zero threshold, that of least risk.

Idea: *Asymptotics and optimal designs of SLOPE for sparse linear regression*, ISIT 2019, arXiv
1903.11582; the shrinkage is that of engine/limits/least_risk.py, for the law believed in.
"""

from dataclasses import dataclass

import numpy as np

from engine.limits.least_risk import least_risk
from engine.normal import Array
from engine.penalties.penalty import Law, Shape

__all__ = ["Designed"]


@dataclass(frozen=True)
class Designed:
    """Sorted-L1 weights made for the signal.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.penalties.designed import Designed
    >>> from engine.penalties.penalty import Law
    >>> shape = Designed().shape(1.0, Law(np.array([1.4]), np.array([0.2])))
    >>> round(shape.risk, 4), shape.weights(np.arange(1, 5), 4).round(2).tolist()
    (0.286, [1.29, 1.0, 1.0, 1.0])
    """

    key: str = "designed"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage of least risk."""
        least = least_risk(threshold, law.sizes.tolist(), law.masses.tolist())

        def weights(ranks: Array, p: int) -> Array:
            # The shares past each node fall from the threshold on; ranks beyond get alpha.
            past = law.beyond(least.x)
            shares = (ranks - 0.5) / p
            at: Array = np.interp(shares, past[::-1], least.withheld[::-1], right=threshold)
            return at

        return Shape(least.risk, least.slope, weights)
