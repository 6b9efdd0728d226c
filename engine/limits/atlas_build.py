"""Making an atlas: every node evaluated by the boundaries themselves."""

from collections.abc import Callable, Iterator
from concurrent.futures import Executor
from typing import Any

import numpy as np

from engine.limits.atlas import (
    AFTER,
    BEFORE,
    CHARTS,
    JUST_PAST,
    PENALTIES,
    Atlas,
    Chart,
    levels,
)
from engine.limits.sorted_l1 import optima, sorted_l1_boundary
from engine.limits.two_level import two_level_boundary, two_level_optima
from engine.normal import Array

__all__ = ["build_atlas", "build_row"]

_BOUNDARIES = {"two-level": two_level_boundary, "sorted-l1": sorted_l1_boundary}


def build_atlas(executor: Executor, progress: Callable[[int, int], None]) -> Atlas:
    """Evaluate all rows of all charts on `executor`, which is told of nothing else.

    `progress` is called with the rows done and the rows in all.
    """
    jobs = [(chart, row) for chart in CHARTS for row in range(chart.rows)]
    rows: dict[str, list[Any]] = {chart.name: [] for chart in CHARTS}
    for done, ((chart, _), row) in enumerate(zip(jobs, _results(executor, jobs), strict=True)):
        rows[chart.name].append(row)
        progress(done + 1, len(jobs))
    return Atlas({name: np.stack(tables) for name, tables in rows.items()})


def _results(executor: Executor, jobs: list[tuple[Chart, int]]) -> Iterator[Any]:
    return executor.map(build_row, *zip(*jobs, strict=True))


def build_row(chart: Chart, row: int) -> Any:
    """Return one row of a chart's table."""
    nodes = [_node(*chart.study(row, column)) for column in range(chart.columns)]
    return levels(np.stack(nodes))


def _node(delta: float, eps: float) -> Array:
    """The turn and the FDPs before and after it, for each penalty."""
    parts = []
    for penalty in PENALTIES:
        turn = _turn(penalty, delta, eps)
        past = min(turn + JUST_PAST, 1.0)
        tpp = np.concatenate([turn * BEFORE, past + (1.0 - past) * AFTER])
        parts.append(np.append(turn, _BOUNDARIES[penalty](tpp, delta, eps)))
    return np.stack(parts)


def _turn(penalty: str, delta: float, eps: float) -> float:
    """The TPP up to which the law that is best at low TPP stays best; 1 when it always does."""
    low, high = 1e-3, 1.0
    for _ in range(4):
        inside = np.linspace(low, high, 14)[1:-1]
        early = _early(penalty, inside, delta, eps)
        if early.all():
            if high == 1.0:
                return 1.0
            low = float(inside[-1])
            continue
        first = int(np.argmin(early))
        high = float(inside[first])
        low = float(inside[first - 1]) if first else low
    return low


def _early(penalty: str, u: Array, delta: float, eps: float) -> Any:
    """Whether the polar law, or the closed form, is still best."""
    deltas, sparsities = np.full_like(u, delta), np.full_like(u, eps)
    if penalty == "sorted-l1":
        return np.array([np.isinf(o.sizes[-1]) for o in optima(u, deltas, sparsities)])
    return np.array(
        [kind != "searched" for kind in two_level_optima(u, deltas, sparsities).kind]
    )


if __name__ == "__main__":
    # `python -m engine.limits.atlas_build FILE` makes the ready atlas again: some ten minutes
    # of one processor.
    import sys
    from concurrent.futures import ProcessPoolExecutor
    from pathlib import Path

    from engine.limits.atlas import dump_atlas

    def _tell(done: int, total: int) -> None:
        print(f"{done} of {total} rows", end="\r", file=sys.stderr, flush=True)

    with ProcessPoolExecutor() as _executor:
        Path(sys.argv[1]).write_bytes(dump_atlas(build_atlas(_executor, _tell)))
