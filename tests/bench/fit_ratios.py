"""Speed of paths of fits as ratios to other solvers at the same certified gap, in one run."""

import time
from collections.abc import Callable

import numpy as np
from sklearn.linear_model import lasso_path
from threadpoolctl import threadpool_limits

from engine.fit.certificate import least_empty_scale
from engine.fit.prox import prox
from engine.fit.solver import Solver
from tests.bench.engine_ratios import Ratio
from tests.bench.fista import fista, relative_gap
from tests.engine.fit.problems import study, weights_of

__all__ = ["fit_ratios"]

GAP = 1e-6
SCALES = np.geomspace(1.0, 0.1, 21)[1:]


def fit_ratios() -> list[Ratio]:
    """Measure paths of 20 strengths on 1000 runs of 2000 candidates, CPU time, one thread."""
    X, y = study(1000, 2000)
    X = np.asfortranarray(X)
    with threadpool_limits(1):
        return [
            _ratio("lasso path, 20 at 1000 x 2000", "lasso_path", X, y, "lasso", _peer, 0.7),
            _ratio("ramp path, 20 at 1000 x 2000", "FISTA path", X, y, "ramp", _naive, 0.4),
        ]


def _ratio(what, yardstick, X, y, kind, other, bound) -> Ratio:
    weights = weights_of(kind, X.shape[1])
    top = least_empty_scale(X.T @ y, weights)
    every = [scale * weights for scale in top * SCALES]
    ours, theirs = (_seconds(lambda way=way: way(X, y, every)) for way in (_ours, other))
    for way in (_ours, other):
        worst = max(
            relative_gap(X, y, b, w) for b, w in zip(way(X, y, every), every, strict=True)
        )
        if worst > 1.001 * GAP:  # rounding
            raise AssertionError(f"{what}: {way.__name__} has a gap of {worst:.3g}")
    return Ratio(what, yardstick, ours / theirs, bound)


def _ours(X, y, every):
    solver = Solver(X, y)
    return [solver.solve(weights, GAP).b for weights in every]


def _peer(X, y, every):
    # Its loss is divided by the runs; its gap is told in units of ||y||^2, ours of half that.
    alphas = [weights[0] / y.size for weights in every]
    return lasso_path(X, y, alphas=alphas, tol=0.5 * GAP, max_iter=100_000)[1].T


def _naive(X, y, every):
    step = 1.0 / np.linalg.norm(X, 2) ** 2
    fits, b = [], np.zeros(X.shape[1])
    for weights in every:
        b = fista(X, y, weights, GAP, (b, step), prox)
        fits.append(b)
    return fits


def _seconds(work: Callable[[], object]) -> float:
    """Return the shortest CPU time of three calls."""
    times = []
    for _ in range(3):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)
