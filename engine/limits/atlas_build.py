"""Making an atlas: every node evaluated by the boundaries themselves.

The work is cut into slices, one row of a chart each. Nothing here knows where slices are kept
or who evaluates them: the caller hands over an executor and what to do with a slice.
"""

from collections.abc import Callable
from concurrent.futures import Executor, as_completed
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from engine.limits.atlas import BOUNDARIES, EARLY, LATE, Atlas, break_of
from engine.limits.atlas_charts import CHARTS, Chart
from engine.limits.atlas_known import Known, known
from engine.limits.sorted_l1 import optima
from engine.limits.transition import critical, limit
from engine.limits.two_level import two_level_optima
from engine.normal import Array

__all__ = ["Slice", "build_atlas", "build_slice", "finer_charts", "slices_of"]

Table = npt.NDArray[np.float32]
Pointwise = Callable[[Array, Array, Array], Any]


@dataclass(frozen=True)
class Slice:
    """One row of a chart: what one worker evaluates at a time."""

    chart: Chart
    row: int

    @property
    def name(self) -> str:
        """A name of its own among the slices of an atlas."""
        return f"{self.chart.name}-{self.row:04d}"


def finer_charts(times: int) -> tuple[Chart, ...]:
    """Return the charts with `times` as many rows and columns as those that ship."""
    return tuple(replace(c, rows=c.rows * times, columns=c.columns * times) for c in CHARTS)


def slices_of(charts: tuple[Chart, ...]) -> list[Slice]:
    """Return the slices of an atlas."""
    return [Slice(chart, row) for chart in charts for row in range(chart.rows)]


def build_atlas(
    charts: tuple[Chart, ...],
    executor: Executor,
    evaluate: Callable[[Slice], Table],
    kept: dict[str, Table],
    keep: Callable[[str, Table], None],
    progress: Callable[[int, int], None],
) -> Atlas:
    """Evaluate the slices that are not among `kept`, by name, on `executor`.

    `evaluate` is `build_slice`, or what stands in for it in a test. `keep` is handed each new
    slice as soon as it is done, in no order; `progress` is called with the slices done and the
    slices in all.
    """
    slices = slices_of(charts)
    done = {each.name: kept[each.name] for each in slices if each.name in kept}
    progress(len(done), len(slices))
    missing = [each for each in slices if each.name not in done]
    running = {executor.submit(evaluate, each): each.name for each in missing}
    for future in as_completed(running):
        name = running[future]
        done[name] = future.result()
        keep(name, done[name])
        progress(len(done), len(slices))
    rows: dict[str, list[Table]] = {chart.name: [] for chart in charts}
    for each in slices:
        rows[each.chart.name].append(done[each.name])
    return Atlas({name: np.stack(tables) for name, tables in rows.items()})


def build_slice(each: Slice) -> Table:
    """Evaluate the nodes of one row, side by side."""
    studies = [each.chart.study(each.row, column) for column in range(each.chart.columns)]
    row = _Row(each.chart, [known(*study) for study in studies], *np.array(studies).T)
    numbers = []
    for penalty, fdp_of in BOUNDARIES.items():
        turn, at_break, past = _two_level(row) if penalty == "two-level" else _sorted_l1(row)
        before = turn[:, None] + (at_break - turn)[:, None] * EARLY
        after = past[:, None] + (1.0 - past)[:, None] * LATE
        fdp = row.at(fdp_of, np.minimum(np.hstack([before, after]), 1.0))
        end = np.array([study.end(penalty) for study in row.studies])
        shares = fdp / (1.0 - row.eps)[:, None]
        numbers.append(np.column_stack([turn, at_break - end, shares]))
    return np.stack(numbers, axis=1).astype(np.float32)


@dataclass(frozen=True)
class _Row:
    """The studies of a row, their sampling ratios and sparsities."""

    chart: Chart
    studies: list[Known]
    delta: Array
    eps: Array

    def at(self, function: Pointwise, u: Array) -> Any:
        """A function of flat arrays at TPPs of shape (studies, n)."""
        count = u.shape[1]
        flat = function(u.ravel(), np.repeat(self.delta, count), np.repeat(self.eps, count))
        return flat.reshape(u.shape)

    def breaks(self, penalty: str, turn: Array) -> Array:
        """The breaks that do not have to be searched."""
        pairs = zip(self.studies, turn.tolist(), strict=True)
        return np.array([break_of(self.chart, study, penalty, t, 0.0) for study, t in pairs])

    def last(self, holds: Pointwise, top: Array) -> list[Array]:
        """The TPP up to which `holds` does, at most `top`, and one just above it."""
        low, high = 1e-3 * top, top
        rows = np.arange(len(top))
        for parts in _PARTS:
            tried = low[:, None] + (high - low)[:, None] * np.linspace(0.0, 1.0, parts + 1)
            held = np.ones(tried.shape, bool)
            held[:, 1:-1] = self.at(holds, tried[:, 1:-1])
            held[:, -1] = False
            first = held.argmin(axis=1)
            low, high = tried[rows, first - 1], tried[rows, first]
        low = np.where(low > top * (1.0 - 1e-5), top, low)
        return [low, np.maximum(low, high)]


# Parts that an interval is cut into, each time the one where the change lies: to 1e-6 in all.
_PARTS = (13, 5, 5, 5, 5, 5, 5)


def _sorted_l1(row: _Row) -> tuple[Array, Array, Array]:
    """Turn, break, and the TPP just past the break, of sorted L1."""
    turn = row.last(_polar, np.ones_like(row.delta))[0]
    at_break = row.breaks("sorted-l1", turn)
    return turn, at_break, at_break


def _two_level(row: _Row) -> tuple[Array, Array, Array]:
    """The same of exact two-level: its break is the last TPP with a law like sorted L1's."""
    top = np.ones_like(row.delta)
    if row.chart.name == "kept":
        turn = row.last(_unsearched, top)[0]
        at_break = row.breaks("two-level", turn)
        return turn, at_break, at_break
    at_break, past = row.last(_like_sorted_l1, top)
    return row.last(_unsearched, at_break)[0], at_break, past


def _polar(u: Array, delta: Array, eps: Array) -> Any:
    return np.array([np.isinf(optimum.sizes[-1]) for optimum in optima(u, delta, eps)])


def _unsearched(u: Array, delta: Array, eps: Array) -> Any:
    return np.array(two_level_optima(u, delta, eps).kind) != "searched"


# Laws like sorted L1's have their lower level at almost the actives' size; the others leave it
# far below. Where the boundary jumps, the ratio of the two leaps over this one.
_HIGH = 0.65


def _like_sorted_l1(u: Array, delta: Array, eps: Array) -> Any:
    found = two_level_optima(u, delta, eps)
    kind = np.array(found.kind)
    high = (kind == "searched") & (found.height > _HIGH * found.size)
    lasso = (kind == "closed form") & (u <= limit(delta, eps, critical(delta)))
    return (kind == "polar") | high | lasso
