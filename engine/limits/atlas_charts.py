"""Where the searched boundaries differ from what is known: three charts of the phase plane.

With x the share of `saturated` polar laws at a sampling ratio, the largest sparsity up to which
the polar law lasts to TPP 1:

- 'lost': sparsities above x, where the polar law ends before TPP 1;
- 'few': sparsities up to x, near which something better is found at high TPP;
- 'kept': sampling ratios above the largest that loses the polar law (about 0.698).

Elsewhere nothing is stored: no search has found anything better than what is known.
"""

import math
from dataclasses import dataclass

import numpy as np

from engine.limits.atlas_known import LARGEST_LOST, Known
from engine.limits.polar import saturated

__all__ = [
    "CHARTS",
    "LEAST_RATIO",
    "LEAST_SPARSITY",
    "MOST_RATIO",
    "MOST_SPARSITY",
    "Chart",
    "chart_of",
]

LEAST_RATIO, MOST_RATIO = 0.01, 20.0
LEAST_SPARSITY, MOST_SPARSITY = 0.0005, 0.98


@dataclass(frozen=True)
class Chart:
    """A regular grid over a piece of the phase plane, in coordinates from 0 to 1.

    Rows go along the sampling ratio and columns along the sparsity; they crowd where the
    boundaries change fastest: beside x, and beside the largest ratio that loses the polar law.
    """

    name: str
    rows: int
    columns: int

    def place(self, study: Known) -> tuple[float, float]:
        """Coordinates of a study, in rows and columns."""
        eps = study.sparsity
        if self.name == "kept":
            row = math.sqrt((study.sampling_ratio - LARGEST_LOST) / (_LAST_KEPT - LARGEST_LOST))
        else:
            part = (study.level - _LEAST_LEVEL) / (self._last_level - _LEAST_LEVEL)
            row = max(part, 0.0) ** _BEND
        low, high = self._ends(study.share)
        if self.name == "lost":
            column = math.sqrt(max(math.log(eps / low) / math.log(high / low), 0.0))
        elif self.name == "few":
            column = 1.0 - math.sqrt(max(math.log(high / eps) / math.log(high / low), 0.0))
        else:
            column = (eps - low) / (high - low)
        return row * (self.rows - 1), column * (self.columns - 1)

    def study(self, row: int, column: int) -> tuple[float, float]:
        """Sampling ratio and sparsity of a node."""
        across, along = row / (self.rows - 1), column / (self.columns - 1)
        if self.name == "kept":
            delta = LARGEST_LOST + (_LAST_KEPT - LARGEST_LOST) * across**2
        else:
            part = across ** (1.0 / _BEND)
            level = _LEAST_LEVEL + (self._last_level - _LEAST_LEVEL) * part
            # By a table: exact enough to place a node, which is evaluated where it is placed.
            delta = float(np.interp(-level, -_LEVELS, _RATIOS))
        low, high = self._ends(float(saturated(np.asarray(delta))[1]))
        if self.name == "lost":
            eps = low * (high / low) ** (along**2)
        elif self.name == "few":
            eps = high * (low / high) ** ((1.0 - along) ** 2)
        else:
            eps = low + (high - low) * along
        return delta, eps

    def _ends(self, share: float) -> tuple[float, float]:
        """The sparsities of the first and the last column; nodes keep to their side of x."""
        if self.name == "kept":
            return _FIRST_KEPT, MOST_SPARSITY
        if self.name == "lost":
            return share * 1.0005, MOST_SPARSITY
        return _LEAST_FEW * share, share * 0.9995

    @property
    def _last_level(self) -> float:
        return _MOST_LEVEL if self.name == "lost" else _MOST_LEVEL_FEW


def chart_of(charts: tuple[Chart, ...], study: Known) -> Chart | None:
    """Return the chart that holds a study, or None where nothing is stored."""
    lost, few, kept = charts
    delta, eps = study.sampling_ratio, study.sparsity
    if delta >= LARGEST_LOST:
        return kept if delta <= _LAST_KEPT and eps >= _FIRST_KEPT else None
    if eps > study.share:
        return lost
    return few if delta >= _FIRST_FEW and eps >= _LEAST_FEW * study.share else None


# Sampling ratios and sparsities, the latter in units of x in 'few', outside of which neither
# search found anything at 24,000 points.
_FIRST_FEW, _LEAST_FEW = 0.45, 0.6
_LAST_KEPT, _FIRST_KEPT = 2.2, 0.25

# Below 1, rows crowd at the largest ratio that loses the polar law.
_BEND = 0.7

# The level of the saturated law over the sampling ratio; it bends at the largest one.
_RATIOS = LARGEST_LOST - (LARGEST_LOST - LEAST_RATIO) * np.linspace(1.0, 0.0, 4001) ** 2
_LEVELS = saturated(_RATIOS)[0]
_LEAST_LEVEL, _MOST_LEVEL = float(_LEVELS[-1]), float(_LEVELS[0])
_MOST_LEVEL_FEW = float(saturated(np.asarray(_FIRST_FEW))[0])

CHARTS = (Chart("lost", 60, 46), Chart("few", 12, 14), Chart("kept", 24, 32))
