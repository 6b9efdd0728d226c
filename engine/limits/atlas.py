"""The searched boundaries read off a grid: fast enough to follow the hand.

Most of the plane needs no grid: there the boundary is the closed form or the polar law, which
are explicit (`engine.limits.atlas_known`). Where a search finds something better, on the charts
of `engine.limits.atlas_charts`, a node holds for each of the two penalties

- the turn, the TPP from which on the search wins;
- the break, the TPP at which the law gives way to one of another kind (for exact two-level the
  boundary jumps there, in sparse studies by up to 0.1), as its distance from the end of the
  polar law;
- the FDP, divided by that of random picks, at fixed places from the turn to the break and from
  the break to TPP 1.

Between nodes it is cubic interpolation of these numbers, so that turn and break stay sharp.

How far the atlas that ships strays from the boundaries, more than 0.01 in TPP from the power
limit and 1 percent in sparsity from the critical one: at 41,000 random points the median is
below 1e-7, since most have a closed form; at 2,600 past the transition and above the power
limit it is 3e-6. Sorted L1 strayed by 1.8e-3 at most, two-level by more than 2e-3 at 3 points.
What remains is beside the jump of two-level: a point between it and where the grid has it is
off by the jump, up to 0.04 where it was aimed at; and where the jump runs into TPP 1, at
sampling ratios of 0.6 to 0.7, up to 0.02. `Atlas.boundary` evaluates these too, and strayed by
2.1e-3 at most at 52,000 points.
tests/engine/limits/test_atlas.py measures both.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from engine.limits.atlas_charts import (
    CHARTS,
    LEAST_RATIO,
    LEAST_SPARSITY,
    MOST_RATIO,
    MOST_SPARSITY,
    Chart,
    chart_of,
)
from engine.limits.atlas_known import Known, known
from engine.limits.sorted_l1 import sorted_l1_boundary
from engine.limits.two_level import two_level_boundary
from engine.normal import Array

__all__ = ["PENALTIES", "Atlas"]

BOUNDARIES = {"two-level": two_level_boundary, "sorted-l1": sorted_l1_boundary}
PENALTIES = tuple(BOUNDARIES)

# Places between turn and break, and between break and TPP 1, as equal steps of a coordinate w.
# They crowd before the break, at which the boundary steepens like a root, after it, and before
# TPP 1.
EARLY_STEPS, LATE_STEPS = np.linspace(0.0, 1.0, 28), np.linspace(0.0, 1.0, 48)
EARLY = 1.0 - (1.0 - EARLY_STEPS) ** 2
LATE = np.sin(0.5 * np.pi * LATE_STEPS) ** 2

# Numbers of a node before its FDPs: the turn, and the break less the end of the polar law.
LEADING = 2
NUMBERS = LEADING + len(EARLY) + len(LATE)

# The strips in which values are evaluated instead of read: beside the power limit in TPP,
# beside the critical sparsity in proportion, beside a jump in TPP.
STRIP_TPP, STRIP_SPARSITY, STRIP_JUMP = 0.01, 0.01, 0.003

# Where the jump runs into TPP 1.
_CORNER_RATIOS, _CORNER_TPP = (0.6, 0.7), 0.988


@dataclass(frozen=True, eq=False)  # one atlas is told from another by being another
class Atlas:
    """Tables of all charts, by name: of shape (rows, columns, penalties, numbers)."""

    tables: dict[str, npt.NDArray[np.float32]]

    @property
    def charts(self) -> tuple[Chart, ...]:
        """The charts, as fine as the tables are."""
        return tuple(Chart(c.name, *self.tables[c.name].shape[:2]) for c in CHARTS)

    def boundary(self, penalty: str, tpp: Any, sampling_ratio: float, sparsity: float) -> Array:
        """Lowest FDP at TPPs of one study: read outside `inside_strip`, evaluated in it."""
        u = np.atleast_1d(np.asarray(tpp, dtype=float))
        fdp = self.read(penalty, u, sampling_ratio, sparsity)
        near = self.inside_strip(penalty, u, sampling_ratio, sparsity)
        if near.any():
            fdp[near] = BOUNDARIES[penalty](u[near], sampling_ratio, sparsity)
        return fdp

    def inside_strip(
        self, penalty: str, tpp: Any, sampling_ratio: float, sparsity: float
    ) -> npt.NDArray[np.bool_]:
        """Whether values at TPPs of a study are to be evaluated instead of read.

        So they are within 0.01 of a power limit below 1, at sparsities within 1 percent of the
        critical one, and for studies off the grid. No grid tells the two sides of a jump apart
        that it places a little wrong, so they are too within 0.003 of where exact two-level
        jumps, and in the last 0.012 of TPP at the ratios at which the jump runs into TPP 1.
        """
        u = np.atleast_1d(np.asarray(tpp, dtype=float))
        delta, eps = _on_grid(sampling_ratio, sparsity)
        study = known(delta, eps)
        off_grid = (delta, eps) != (sampling_ratio, sparsity)
        from_critical = abs(eps / study.critical_sparsity - 1.0)
        if off_grid or (delta < 1.0 and from_critical <= STRIP_SPARSITY):
            return np.ones(u.shape, bool)
        inside = (np.abs(u - study.power_limit) <= STRIP_TPP) & (study.power_limit < 1.0)
        if _CORNER_RATIOS[0] <= delta <= _CORNER_RATIOS[1] and study.power_limit < 1.0:
            inside |= u >= _CORNER_TPP
        node = self._node(penalty, study)
        if penalty == "two-level" and node is not None and node.jump > _LEAST_JUMP:
            inside |= np.abs(u - node.at_break) <= STRIP_JUMP
        return inside

    def curve(
        self, penalty: str, sampling_ratio: float, sparsity: float
    ) -> tuple[Array, Array]:
        """Return nodes (tpp, fdp) of a boundary, from (0, 0) to TPP 1.

        They are as read, dense enough for straight lines between them. Studies off the grid
        are read at its edge.
        """
        study = known(*_on_grid(sampling_ratio, sparsity))
        node = self._node(penalty, study)
        turn, at_break = (1.0, 1.0) if node is None else (node.turn, node.at_break)
        corners = np.array([study.power_limit, study.end(penalty), at_break])
        pieces = (
            turn * _BOTH_ENDS,
            turn + (at_break - turn) * EARLY,
            at_break + (1.0 - at_break) * LATE,
            corners,
            corners + _PAST,
        )
        tpp = np.unique(np.minimum(np.concatenate(pieces), 1.0))
        tpp = tpp[np.append(np.diff(tpp) > 0.5 * _PAST, True)]
        return np.append(0.0, tpp), np.append(0.0, _lowest(penalty, tpp, study, node))

    def read(self, penalty: str, tpp: Array, sampling_ratio: float, sparsity: float) -> Array:
        """Return the FDP at TPPs as the grid has it; off the grid, as its edge has it."""
        study = known(*_on_grid(sampling_ratio, sparsity))
        return _lowest(penalty, tpp, study, self._node(penalty, study))

    def read_all(self, tpp: Array, sampling_ratio: float, sparsity: float) -> dict[str, Array]:
        """Return what `read` does for every penalty, in less time."""
        study = known(*_on_grid(sampling_ratio, sparsity))
        return {key: _lowest(key, tpp, study, self._node(key, study)) for key in PENALTIES}

    def _node(self, penalty: str, study: Known) -> "_Node | None":
        """The numbers between the nodes around a study; None where nothing is stored."""
        chart = chart_of(self.charts, study)
        if chart is None:
            return None
        row, column = chart.place(study)
        i, across = _cubic(row, chart.rows)
        j, along = _cubic(column, chart.columns)
        block = self.tables[chart.name][i : i + 4, j : j + 4, PENALTIES.index(penalty)]
        numbers = across @ (along @ block).reshape(4, -1)
        turn = min(max(float(numbers[0]), 0.0), 1.0)
        at_break = break_of(chart, study, penalty, turn, float(numbers[1]))
        early, late = np.split(numbers[LEADING:] * (1.0 - study.sparsity), [len(EARLY)])
        return _Node(turn, at_break, early, late)


@dataclass(frozen=True)
class _Node:
    """Turn and break, and the FDPs at `EARLY` and `LATE`."""

    turn: float
    at_break: float
    early: Array
    late: Array

    @property
    def jump(self) -> float:
        """Height of the step at the break."""
        return float(self.late[0] - self.early[-1])


# A step of the FDP that is less than this is no jump.
_LEAST_JUMP = 5e-4


def _lowest(penalty: str, tpp: Array, study: Known, node: _Node | None) -> Array:
    """The better of what is known and, past the turn, what was found."""
    fdp = study.fdp(penalty, tpp)
    if node is None or node.turn >= 1.0:
        return fdp
    part = (tpp - node.turn) / max(node.at_break - node.turn, 1e-12)
    rest = (tpp - node.at_break) / max(1.0 - node.at_break, 1e-12)
    # The inverses of EARLY and LATE.
    w_early = 1.0 - np.sqrt(1.0 - np.clip(part, 0.0, 1.0))
    w_late = np.arcsin(np.sqrt(np.clip(rest, 0.0, 1.0))) * (2.0 / np.pi)
    early = np.interp(w_early, EARLY_STEPS, node.early)
    late = np.interp(w_late, LATE_STEPS, node.late)
    found = np.maximum(np.where(tpp > node.at_break, late, early), 0.0)
    return np.where(tpp > node.turn, np.minimum(found, fdp), fdp)


# Nodes of a curve before the turn, and the distance of two nodes that stand for a jump.
_BOTH_ENDS = np.sin(0.5 * np.pi * np.linspace(0.0, 1.0, 65)[1:]) ** 2
_PAST = 1e-9


def break_of(chart: Chart, study: Known, penalty: str, turn: float, shift: float) -> float:
    """TPP of the break: where the polar law ends, shifted; half-way where it lasts."""
    if chart.name == "kept":
        return 0.5 * (turn + 1.0)
    return min(max(study.end(penalty) + shift, turn), 1.0)


def _on_grid(sampling_ratio: float, sparsity: float) -> tuple[float, float]:
    delta = min(max(sampling_ratio, LEAST_RATIO), MOST_RATIO)
    return delta, min(max(sparsity, LEAST_SPARSITY), MOST_SPARSITY)


def _cubic(place: float, count: int) -> tuple[int, Array]:
    """First of the four nodes around a place on a unit grid, and their Lagrange weights."""
    place = min(max(place, 0.0), count - 1.0)
    first = min(max(int(place) - 1, 0), count - 4)
    t = place - first
    weights = (
        -(t - 1.0) * (t - 2.0) * (t - 3.0) / 6.0,
        t * (t - 2.0) * (t - 3.0) / 2.0,
        -t * (t - 1.0) * (t - 3.0) / 2.0,
        t * (t - 1.0) * (t - 2.0) / 6.0,
    )
    return first, np.array(weights)
