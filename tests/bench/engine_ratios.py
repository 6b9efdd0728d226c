"""Speed of the limits as ratios to a yardstick measured in the same run."""

import itertools
import timeit
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import cvxpy as cp
import numpy as np
from scipy.optimize import isotonic_regression
from scipy.special import ndtr

from engine import lasso_boundary, sorted_l1_boundary, two_level_boundary
from engine.limits.atlas_file import load_atlas
from engine.limits.lasso_curve import lasso_curve
from engine.limits.least_risk import least_risk
from engine.prediction import curve
from engine.study import Effect, Study

__all__ = ["Ratio", "engine_ratios"]

ROOT = Path(__file__).parents[2]

STUDY = Study("", 600, 2000, 400, 1.0, (Effect(0.16, 0.6), Effect(0.32, 0.4)))


@dataclass(frozen=True)
class Ratio:
    """A measured ratio and the bound it has to keep; `at_least` where larger is better."""

    what: str
    yardstick: str
    value: float
    bound: float
    at_least: bool = False

    @property
    def kept(self) -> bool:
        return self.value >= self.bound if self.at_least else self.value <= self.bound


def seconds(work: Callable[[], object], number: int, repeats: int = 9) -> float:
    """Return the shortest time of one call: the least disturbed by whatever else runs."""
    work()
    return min(timeit.repeat(work, number=number, repeat=repeats)) / number


def engine_ratios() -> list[Ratio]:
    """Measure all of them: single calls, cold, on the demo study's ratios."""
    delta, eps = 0.3, 0.2
    x = np.linspace(0.0, 5.0, 256)
    ndtr_256 = seconds(lambda: ndtr(x), 2000)
    isotonic_1000 = _isotonic()
    below, along = np.linspace(0.01, 0.56, 256), np.linspace(0.02, 1.0, 48)
    atlas = load_atlas((ROOT / "assets" / "atlas.npz").read_bytes())
    # Another sampling ratio each time: what depends on it alone is remembered.
    ratios_tried = itertools.count(1)
    shrinkage = seconds(lambda: least_risk(1.2, (1.4,), (0.2,)), 200)
    ratios = (
        ("lasso curve, 256 points", "ndtr of 256", ndtr_256, 12, 500,
         lambda: lasso_curve(delta, eps)),
        ("lasso at 256 TPPs", "ndtr of 256", ndtr_256, 2000, 10,
         lambda: lasso_boundary(below, delta, eps)),
        ("sorted-L1 curve, 48 points", "isotonic_regression of 1,000", isotonic_1000, 4000, 1,
         lambda: sorted_l1_boundary(along, delta, eps)),
        ("atlas curve, 48 points", "isotonic_regression of 1,000", isotonic_1000, 50, 10,
         lambda: atlas.read("two-level", along, delta + 1e-7 * next(ratios_tried), eps)),
        ("exact two-level, 48 points", "isotonic_regression of 1,000", isotonic_1000, 15_000, 1,
         lambda: two_level_boundary(along, delta, eps)),
        ("designed, curve for a signal, 60 points", "isotonic_regression of 1,000",
         isotonic_1000, 6000, 1, lambda: curve(STUDY, "designed")),
        ("tuned two-level, curve for a signal, 60 points", "isotonic_regression of 1,000",
         isotonic_1000, 30_000, 1, lambda: curve(STUDY, "two-level")),
    )  # fmt: skip
    measured = [
        Ratio(what, yardstick, seconds(work, number) / unit, bound)
        for what, yardstick, unit, bound, number, work in ratios
    ]
    program = seconds(quadratic_program(1000), 1, 3)
    what = "quadratic program, 1,000 nodes"
    return [*measured, Ratio(what, "one least risk", program / shrinkage, 500, at_least=True)]


def _isotonic() -> float:
    rng = np.random.default_rng(0)
    values = np.linspace(0.0, 3.0, 1000) + rng.uniform(size=1000)
    weights = rng.uniform(size=1000)
    return seconds(lambda: isotonic_regression(values, weights=weights), 300)


def quadratic_program(nodes: int) -> Callable[[], object]:
    """Return the generic statement of one least risk: A rising from the threshold on.

    min sum w (A - a)^2 over A, with 0 <= A' <= 1 and A >= threshold, as a person would hand it
    to cvxpy; the time is that of stating and solving it.
    """
    x = np.linspace(1.2, 12.0, nodes)
    step = x[1] - x[0]
    density = 1.6 * np.exp(-0.5 * x * x) + 0.2 * np.exp(-0.5 * (x - 1.4) ** 2)
    mean = 0.2 * 1.4 * np.exp(-0.5 * (x - 1.4) ** 2) / density
    aim, root = x - mean, np.sqrt(density * step)

    def solve() -> object:
        withheld = cp.Variable(nodes)
        rises = cp.diff(withheld)
        constraints = [withheld >= 1.2, rises >= 0, rises <= step]
        goal = cp.Minimize(cp.sum_squares(cp.multiply(root, withheld - aim)))
        return cp.Problem(goal, constraints).solve(solver=cp.CLARABEL)

    return solve
