"""The searched boundaries read off a grid: fast enough to follow the hand.

The boundaries of two-level and sorted L1 are smooth in sampling ratio and sparsity within three
charts, and along TPP on either side of the TPP at which their best law changes (close to the
power limit). Each chart is a regular grid in coordinates of its own; a node holds, for each of
the two penalties, that TPP and the FDP at fixed fractions of the stretch before it and after
it. Between nodes it is cubic interpolation of these numbers, so the break stays sharp.

The values are for drawing and for a first answer; tests state how far they stray. For values
to rely on, call the boundaries themselves.
"""

import hashlib
import io
import zipfile
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from engine.limits.transition import critical, threshold_at_ratio
from engine.normal import Array

__all__ = ["CHARTS", "PENALTIES", "Atlas", "Chart", "dump_atlas", "load_atlas"]

VERSION = 1
PENALTIES = ("two-level", "sorted-l1")

# Fractions of TPP before and after the break; the first after it stands just past it.
BEFORE = np.linspace(0.0, 1.0, 33)[1:]
AFTER = np.linspace(0.0, 1.0, 25)
JUST_PAST = 1e-4

LEAST_RATIO, MOST_RATIO = 0.01, 20.0
LEAST_SPARSITY, MOST_SPARSITY = 0.0005, 0.98

_LEVELS = 65535  # 16 bits for shares in [0, 1]: steps of 1.5e-5


@dataclass(frozen=True)
class Chart:
    """A smooth piece of the phase plane, with its grid.

    'sparse' and 'dense' lie on the two sides of the transition, at sampling ratios below 1;
    'above' holds all sparsities at ratios from 1 on.
    """

    name: str
    rows: int
    columns: int

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the chart's table."""
        return (self.rows, self.columns, len(PENALTIES), 1 + len(BEFORE) + len(AFTER))

    def place(self, delta: float, eps: float, eps_star: float) -> tuple[float, float]:
        """Coordinates of a study on the grid, in rows and columns."""
        if self.name == "above":
            row = np.log(delta) / np.log(MOST_RATIO)
        else:
            row = threshold_at_ratio(np.asarray(delta)) / _LARGEST_T
        low, high = self._ends(eps_star)
        column = (self._scale(eps) - low) / (high - low)
        return float(row) * (self.rows - 1), float(column) * (self.columns - 1)

    def study(self, row: int, column: int) -> tuple[float, float]:
        """Sampling ratio and sparsity of a node."""
        delta = self._ratio(row / (self.rows - 1))
        eps_star = float(critical(np.asarray(delta)))
        low, high = self._ends(eps_star)
        scaled = low + column / (self.columns - 1) * (high - low)
        eps = scaled**3 if self.name == "above" else np.exp(scaled)
        return delta, float(np.clip(eps, 0.5 * LEAST_SPARSITY, 0.9999))

    def _ratio(self, part: float) -> float:
        if self.name == "above":
            return float(MOST_RATIO**part)
        t = np.linspace(0.0, _LARGEST_T, 20_001)[1:]
        # The inverse of threshold_at_ratio by its own table: exact enough to place a node,
        # because the node is evaluated at the ratio that is returned.
        return float(np.interp(max(part * _LARGEST_T, _SMALLEST_T), t, _ratio_at(t)))

    def _ends(self, eps_star: float) -> tuple[float, float]:
        # Just inside the transition, so that every node lies on its own side of it.
        ends = {
            "sparse": (LEAST_SPARSITY, min(eps_star * (1.0 - 1e-5), 0.9995)),
            "dense": (min(eps_star * (1.0 + 1e-5), 0.97), MOST_SPARSITY),
            "above": (LEAST_SPARSITY, MOST_SPARSITY),
        }[self.name]
        return self._scale(ends[0]), self._scale(ends[1])

    def _scale(self, eps: float) -> float:
        return float(np.cbrt(eps)) if self.name == "above" else float(np.log(eps))
