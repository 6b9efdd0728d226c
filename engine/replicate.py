"""One finite study of a rehearsal: drawn, fitted by every procedure, and counted.

All procedures see the same data. Columns and response are centred, columns scaled to length
one: what `engine.fit.fit` does by default.
"""

import time
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from engine.designs import Design
from engine.fit.fitting import Fit, in_given_units
from engine.fit.gram import Matrix
from engine.fit.prox import Indices
from engine.fit.scaling import scaled, varying
from engine.fit.solver import Solver
from engine.fit.two_stage import debiased_z, selected_at_level
from engine.normal import Array
from engine.study import Effect, Spread, Study

__all__ = ["SELECTIONS", "Outcome", "Procedure", "Replicate", "Task", "run_replicate"]

SELECTIONS = ("nonzero", "two-stage", "two-stage-bh")


@dataclass(frozen=True, eq=False)
class Procedure:
    """What is done with each study: a fit, and a rule that selects.

    Attributes
    ----------
    name : str
        Its name in the results.
    weights : ndarray, shape (candidates,)
        Weights of the ranks on columns of length one, nonincreasing, in the response's unit;
        one number for the lasso.
    selection : {'nonzero', 'two-stage', 'two-stage-bh'}
        Nonzero in the fit; or debiased, and cut at a threshold, or by Benjamini-Hochberg.
    cut : float or None
        Threshold on |z| for 'two-stage', level for 'two-stage-bh', None for 'nonzero'.
    """

    name: str
    weights: Any = field(repr=False)
    selection: str = "nonzero"
    cut: float | None = None


@dataclass(frozen=True)
class Outcome:
    """What one procedure found in one replicate.

    Attributes
    ----------
    tpp, fdp : float
        Shares of the actives found and of the list that is false; nan where a two-stage rule
        has no list, because the fit has as many distinct magnitudes as there are runs.
    list_size : int
        Candidates selected.
    certified : bool
        Whether the fit reached its duality gap.
    undecided : int
        Candidates whose being zero in the fit is not settled.
    """

    tpp: float
    fdp: float
    list_size: int
    certified: bool
    undecided: int


@dataclass(frozen=True)
class Replicate:
    """One finite study: an outcome a procedure, and the CPU seconds it took."""

    index: int
    outcomes: tuple[Outcome, ...]
    seconds: float = field(compare=False)


@dataclass(frozen=True, eq=False)
class Task:
    """All that a worker needs."""

    study: Study
    procedures: tuple[Procedure, ...]
    design: Design
    seed: int
    gap: float


def run_replicate(task: Task, index: int) -> Replicate:
    """Draw the study with this index and let every procedure find what it can."""
    start = time.thread_time()
    study = task.study
    stream = np.random.SeedSequence(task.seed, spawn_key=(index,))
    for_design, for_effects, for_noise = map(np.random.default_rng, stream.spawn(3))
    X = task.design.draw(study.runs, study.candidates, for_design)
    effects = _draw_effects(study, for_effects)
    noise = study.noise_sd * for_noise.standard_normal(study.runs)
    fits = _Fits(X, X @ effects + noise, task.gap)
    active = effects != 0.0
    outcomes = tuple(_outcome(fits, procedure, active) for procedure in task.procedures)
    return Replicate(index, outcomes, time.thread_time() - start)


def _draw_effects(study: Study, rng: np.random.Generator) -> Array:
    shares = np.array([effect.share for effect in study.effects])
    # As many actives to each effect as its share, the last ones to the largest remainders.
    due = study.actives * shares / shares.sum()
    counts = np.floor(due).astype(int)
    left = study.actives - counts.sum()
    counts[np.argsort(counts - due, kind="stable")[:left]] += 1
    sizes = np.concatenate(
        [_sizes(effect, n, rng) for effect, n in zip(study.effects, counts, strict=True)]
    )
    effects = np.zeros(study.candidates)
    places = rng.permutation(study.candidates)[: study.actives]
    effects[places] = rng.choice([-1.0, 1.0], size=study.actives) * sizes
    return effects


def _sizes(effect: Effect | Spread, count: int, rng: np.random.Generator) -> Array:
    if isinstance(effect, Effect):
        return np.full(count, effect.size)
    if effect.spread == "normal":
        return effect.scale * rng.standard_normal(count)
    return rng.exponential(effect.scale, count)


class _Fits:
    """The fits of one draw, each made once, each started from the one before."""

    def __init__(self, X: Matrix, y: Array, gap: float) -> None:
        self._varying = np.flatnonzero(varying(X))
        self._candidates = X.shape[1]
        self._gap = gap
        self._made: dict[bytes, Fit] = {}
        if self._varying.size < self._candidates:
            X = X[:, self._varying]
        if self._varying.size:
            self._problem = scaled(X, y, "unit-length", "sum", True)
            self._solver = Solver(self._problem.X, self._problem.y)

    def at(self, weights: Array) -> Fit | None:
        """The fit at these weights; None where no column varies."""
        if not self._varying.size:
            return None
        key = weights.tobytes()
        if key not in self._made:
            factor = self._problem.weight_factor
            solution = self._solver.solve(factor * weights[: self._varying.size], self._gap)
            self._made[key] = in_given_units(solution, self._problem)
        return self._made[key]

    def selected(self, fit: Fit, procedure: Procedure) -> Indices | None:
        """Candidates that the procedure selects; None where it has no list."""
        if procedure.selection == "nonzero":
            return self._varying[fit.support]
        df = int(fit.clusters.max())
        if df >= fit.runs or procedure.cut is None:
            return None
        sizes = np.zeros(self._candidates)
        z, _ = debiased_z(fit.estimates, fit.correlations, fit.residual_norm, df, fit.runs)
        sizes[self._varying] = np.abs(z)
        if procedure.selection == "two-stage":
            return np.flatnonzero(sizes > procedure.cut)
        return selected_at_level(sizes, procedure.cut).selected


def _outcome(
    fits: _Fits, procedure: Procedure, active: "np.ndarray[Any, np.dtype[np.bool_]]"
) -> Outcome:
    fit = fits.at(procedure.weights)
    if fit is None:
        return Outcome(0.0, 0.0, 0, True, 0)
    selected = fits.selected(fit, procedure)
    told = fit.certified, int(fit.undecided.size)
    if selected is None:
        return Outcome(float("nan"), float("nan"), 0, *told)
    true = int(np.count_nonzero(active[selected]))
    false = int(selected.size) - true
    tpp = true / int(np.count_nonzero(active))
    return Outcome(tpp, false / max(1, int(selected.size)), int(selected.size), *told)
