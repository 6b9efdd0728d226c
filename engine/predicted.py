"""What a prediction says, in every scaling a user meets."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from engine.evolution import State, fdp_of, tpp_of
from engine.normal import Array
from engine.normal import selection as passing
from engine.penalties.penalty import RankedWeights, largest_weight
from engine.signal import SignalLaw
from engine.study import Effect, Study

__all__ = ["Curve", "EffectFound", "Prediction", "none_predicted", "predicted"]

# E eta' per run above which the noise of a debiased fit is unstable: simulated at .93, its
# standard deviation was .7 on 3.8.
_UNSTABLE = 0.9


@dataclass(frozen=True)
class EffectFound:
    """TPP of one effect of the study; `size` is nan for a spread, which has a scale."""

    size: float
    tpp: float
    spread: str = ""
    scale: float = math.nan


@dataclass(frozen=True, eq=False)
class Prediction:
    """What a penalty and a selection rule give; nan and a reason where there is nothing.

    Attributes
    ----------
    penalty, selection : str
        Keys of the family and of the rule.
    tpp, fdp : float
        Limits of both proportions.
    zero_threshold : float
        Of the fit, in units of tau.
    cut : float
        Of debiased estimates, in units of tau; nan without a second stage.
    lam, lam_unit_variance, lam_per_run : float
        Largest weight for columns of length one, for columns of variance one, and for the
        loss divided by twice the runs on the latter: lambda, lambda sqrt(n), lambda / sqrt(n).
    tau, mse : float
        Effective noise, and squared error per coefficient, on columns of length one.
    list_size, true_entries, false_entries : float
        Expected, unrounded.
    by_effect : tuple of EffectFound
        In the order of the study.
    tpp_sd, fdp_sd : float
        Binomial standard deviations of one study: a floor, studies spread at least as much.
    levels, share, ramp_level
        Parameters stated or tuned: two levels in units of tau and the share of the ranks with
        the larger; level of the ramp. None where the family has none.
    reason : str
        Why there are no numbers; empty where there are.
    caution : str
        What makes them doubtful; mostly empty.
    """

    penalty: str
    selection: str
    candidates: int
    tpp: float = math.nan
    fdp: float = math.nan
    zero_threshold: float = math.nan
    cut: float = math.nan
    lam: float = math.nan
    lam_unit_variance: float = math.nan
    lam_per_run: float = math.nan
    tau: float = math.nan
    mse: float = math.nan
    list_size: float = math.nan
    true_entries: float = math.nan
    false_entries: float = math.nan
    by_effect: tuple[EffectFound, ...] = ()
    tpp_sd: float = math.nan
    fdp_sd: float = math.nan
    levels: tuple[float, float] | None = None
    share: float | None = None
    ramp_level: float | None = None
    reason: str = ""
    caution: str = ""
    _weights: RankedWeights | None = field(default=None, repr=False)
    _unit: float = field(default=math.nan, repr=False)

    def weights(self) -> Array:
        """Return the weights of all candidates, largest first, for columns of length one.

        Empty where there is no fit.
        """
        return self.weights_at(np.arange(1.0, self.candidates + 1.0))

    def weights_at(self, ranks: Array) -> Array:
        """Return the weights at some ranks, of which 1 is the largest."""
        if self._weights is None:
            return np.empty(0)
        return self._unit * self._weights(ranks, self.candidates)


def none_predicted(study: Study, penalty: str, selection: str, reason: str) -> Prediction:
    """Return a prediction without numbers, and why."""
    by_effect = _of_effects(study, [math.nan] * len(study.effects))
    return Prediction(penalty, selection, study.candidates, by_effect=by_effect, reason=reason)


def predicted(
    study: Study,
    law: SignalLaw,
    fit: State | float,
    penalty: str,
    selection: str,
    cut: float | None,
    reason: str,
) -> Prediction:
    """Return the prediction of a fit (or of the noise tau without one), cut or as it is."""
    if reason:
        return none_predicted(study, penalty, selection, reason)
    tau = fit.tau if isinstance(fit, State) else fit
    threshold = cut if cut is not None else getattr(fit, "threshold", 0.0)
    tpp = tpp_of(law, tau, threshold)
    fdp = fdp_of(law, tpp, threshold)
    true = study.actives * tpp
    listed = true / (1.0 - fdp) if fdp < 1.0 else math.nan
    numbers = Prediction(
        penalty,
        selection,
        study.candidates,
        tpp=tpp,
        fdp=fdp,
        cut=math.nan if cut is None else cut,
        tau=tau,
        list_size=listed,
        true_entries=true,
        false_entries=listed - true,
        by_effect=_by_effect(study, law, tau, threshold),
        tpp_sd=math.sqrt(tpp * (1.0 - tpp) / study.actives),
        fdp_sd=math.sqrt(fdp * (1.0 - fdp) / listed) if listed > 0.0 else math.nan,
    )
    return _with_fit(numbers, study, law, fit) if isinstance(fit, State) else numbers


def _with_fit(numbers: Prediction, study: Study, law: SignalLaw, fit: State) -> Prediction:
    unit = fit.tau * fit.calibration
    lam = unit * largest_weight(fit.shape, study.candidates)
    root = math.sqrt(study.runs)
    caution = ""
    if numbers.selection != "nonzero" and fit.shape.slope > _UNSTABLE * law.delta:
        caution = (
            "the fit uses up nearly all runs: its noise, by which the cut goes, is unstable"
        )
    return replace(
        numbers,
        zero_threshold=fit.threshold,
        lam=lam,
        lam_unit_variance=lam * root,
        lam_per_run=lam / root,
        mse=law.delta * (fit.tau**2 - law.noise**2),
        levels=fit.shape.levels,
        share=fit.shape.share,
        ramp_level=fit.shape.ramp_level,
        caution=caution,
        _weights=fit.shape.weights,
        _unit=unit,
    )


def _by_effect(
    study: Study, law: SignalLaw, tau: float, threshold: float
) -> tuple[EffectFound, ...]:
    passed = passing(law.sizes / tau, np.asarray(threshold))
    masses = [law.masses[atoms] for atoms in law.groups]
    return _of_effects(
        study,
        [
            float(part @ passed[atoms] / part.sum())
            for part, atoms in zip(masses, law.groups, strict=True)
        ],
    )


def _of_effects(study: Study, tpps: list[float]) -> tuple[EffectFound, ...]:
    return tuple(
        EffectFound(effect.size, tpp)
        if isinstance(effect, Effect)
        else EffectFound(math.nan, tpp, effect.spread, effect.scale)
        for effect, tpp in zip(study.effects, tpps, strict=True)
    )


@dataclass(frozen=True, eq=False)
class Curve:
    """A path along the strength, or along the cut of one fit.

    Attributes
    ----------
    tpp, fdp : ndarray, shape (points,)
    lam : ndarray, shape (points,)
        Largest weight, on columns of length one.
    zero_threshold, cut : ndarray, shape (points,)
        In units of tau; `cut` is nan without a second stage.
    tau : ndarray, shape (points,)
        Effective noise, on columns of length one.
    reason : str
        Why there are no points; empty where there are.
    """

    tpp: Array
    fdp: Array
    lam: Array
    zero_threshold: Array
    cut: Array
    tau: Array
    reason: str = ""

    @classmethod
    def of(cls, states: list[State], study: Study, reason: str = "") -> "Curve":
        """Return the curve of the states of a path."""
        rows = [
            (s.tpp, s.fdp, s.tau * s.calibration * largest_weight(s.shape, study.candidates),
             s.threshold, math.nan, s.tau)
            for s in states
        ]  # fmt: skip
        return cls(*_columns(rows), reason)

    @classmethod
    def of_cuts(cls, study: Study, law: SignalLaw, state: State, cuts: Array) -> "Curve":
        """Return the curve of the cuts of one fit."""
        lam = state.tau * state.calibration * largest_weight(state.shape, study.candidates)
        rows = []
        for cut in cuts.tolist():
            tpp = tpp_of(law, state.tau, cut)
            fdp = fdp_of(law, tpp, cut)
            rows.append((tpp, fdp, lam, state.threshold, cut, state.tau))
        return cls(*_columns(rows))


def _columns(
    rows: Sequence[tuple[float, ...]],
) -> tuple[Array, Array, Array, Array, Array, Array]:
    tpp, fdp, lam, threshold, cut, tau = np.array(rows, dtype=np.float64).reshape(-1, 6).T
    return tpp, fdp, lam, threshold, cut, tau
