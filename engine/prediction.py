"""What a penalty and a selection rule give for the signal the user believes in.

Selection is 'nonzero' in the fit, or in two stages: debias the fit of smallest effective noise,
then cut (*Which bridge estimator is the best for variable selection?*, Annals of Statistics
48(5), 2020); 'two-stage-bh' cuts by Benjamini and Hochberg's procedure, which needs no belief.
"""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
from scipy.optimize import brentq

from engine.evolution import State, fdp_of, settle_all, tpp_of
from engine.penalties.lasso import Lasso
from engine.penalties.penalty import Penalty, largest_weight
from engine.penalties.registry import PENALTIES
from engine.penalties.weights import check_weights
from engine.predicted import Curve, Prediction, none_predicted, predicted
from engine.quantities import FDP, LAMBDA, LEVEL, RAMP_LEVEL, RANK_SHARE, TPP, Quantity, shown
from engine.signal import SignalLaw, signal_law
from engine.study import Study
from engine.walk import Stretch, crossings, quietest, stretches, top_threshold

__all__ = [
    "SELECTIONS",
    "curve",
    "marginal_screening",
    "predict",
    "prediction_optimal_lasso",
]

SELECTIONS = ("nonzero", "two-stage", "two-stage-bh")

_LOOKS = 60
_FEWEST = 1e-6  # TPP below which no path is followed
_CURVE_END = 0.005  # TPP at which curves end
_CUT_ACCURACY = 1e-12
_NO_FIT = "no strength of this penalty has a fit in this regime"


def predict(
    study: Study,
    penalty: str,
    selection: str = "nonzero",
    *,
    fdp: float | None = None,
    tpp: float | None = None,
    lam: float | None = None,
    levels: Any = None,
    share: float | None = None,
    ramp_level: float | None = None,
    weights: Any = None,
) -> Prediction:
    """
    Predict what a penalty and a selection rule find in a study.

    Parameters
    ----------
    study : Study
        Runs, candidates, actives, effects and noise in the user's units.
    penalty : {'lasso', 'two-level', 'ramp', 'designed', 'weights'}
        Family; 'two-level' and 'ramp' without parameters are tuned for the largest TPP, or in
        two stages for the smallest tau.
    selection : {'nonzero', 'two-stage', 'two-stage-bh'}, optional
        Nonzero in the fit; or the fit of smallest tau debiased and cut, at the cut that meets
        the target or by the Benjamini-Hochberg procedure.
    fdp : float, optional
        Target in (0, 1): the largest TPP at exactly this FDP. For 'two-stage-bh' the level of
        the procedure; the FDP expected is (1 - sparsity) times it.
    tpp : float, optional
        Target in (0, 1]: the lowest FDP at exactly this TPP.
    lam : float, optional
        Largest weight, above 0, on columns of length one. One of `fdp`, `tpp` and `lam` is
        given; in two stages `lam` fixes the fit and one of the others the cut.
    levels : tuple of float, optional
        For 'two-level', with `share`: the larger and the smaller level; their ratio counts.
    share : float, optional
        For 'two-level': share of the ranks with the larger level, in (0, 1].
    ramp_level : float, optional
        For 'ramp': level in (0, 1).
    weights : array_like, shape (any,), optional
        For 'weights': nonincreasing weights; their ratios count, the strength scales them.

    Returns
    -------
    Prediction
        Numbers are nan, with a reason in words, where the method gives none.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Notes
    -----
    Asymptotic, for iid Gaussian columns and a signal known in law.

    References
    ----------
    .. [1] *The LASSO risk for Gaussian matrices*, IEEE Trans. Inf. Theory 58(4), 2012.
    .. [2] *Algorithmic analysis and statistical estimation of SLOPE via AMP*, IEEE Trans. Inf.
       Theory 67, 2021.
    .. [3] *Which bridge estimator is the best for variable selection?*, Annals of Statistics
       48(5), 2020.

    Examples
    --------
    >>> from engine import predict
    >>> from engine.demo import DEMO_STUDY
    >>> alone = predict(DEMO_STUDY, "lasso", fdp=0.3)
    >>> staged = predict(DEMO_STUDY, "designed", "two-stage", fdp=0.3)
    >>> round(alone.tpp, 3), round(staged.tpp, 3)
    (0.104, 0.205)
    """
    _check_study(study)
    law = signal_law(study)
    chosen = _penalty(study, penalty, levels, share, ramp_level, weights)
    goals = _goals(selection, fdp, tpp, lam)
    if selection == "nonzero":
        return _nonzero(study, law, chosen, goals)
    if "lam" in goals:
        state, reason = _at_strength(study, law, chosen, goals["lam"])
    else:
        state = quietest(law, chosen)
        reason = "" if state else _NO_FIT
    if state is None:
        return none_predicted(study, chosen.key, selection, reason)
    cut, reason = _cut(law, state.tau, selection, goals)
    return predicted(study, law, state, chosen.key, selection, cut, reason)


def curve(
    study: Study,
    penalty: str,
    selection: str = "nonzero",
    points: int = 60,
    *,
    levels: Any = None,
    share: float | None = None,
    ramp_level: float | None = None,
    weights: Any = None,
) -> Curve:
    """
    Return the whole admissible path of a penalty and a selection rule.

    Parameters
    ----------
    study : Study
        Runs, candidates, actives, effects and noise in the user's units.
    penalty : {'lasso', 'two-level', 'ramp', 'designed', 'weights'}
        As for `predict`.
    selection : {'nonzero', 'two-stage', 'two-stage-bh'}, optional
        In two stages the cut moves along the curve and the fit stays.
    points : int, optional
        At most this many.
    levels, share, ramp_level, weights : optional
        As for `predict`.

    Returns
    -------
    Curve
        From many selections to few. Thresholds over which the path jumps are left out.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Notes
    -----
    Asymptotic, for iid Gaussian columns and a signal known in law.

    Examples
    --------
    >>> from engine.demo import DEMO_STUDY
    >>> from engine.prediction import curve
    >>> path = curve(DEMO_STUDY, "lasso")
    >>> bool((path.fdp[1:] < path.fdp[:-1]).all())
    True
    """
    _check_study(study)
    _check_choice("selection", selection, SELECTIONS)
    if isinstance(points, bool) or not isinstance(points, int) or points < 2:
        raise ValueError(f"points must be a whole number at least 2, not {shown(points)}")
    law = signal_law(study)
    chosen = _penalty(study, penalty, levels, share, ramp_level, weights)
    if selection != "nonzero":
        state = quietest(law, chosen)
        if state is None:
            return Curve.of([], study, _NO_FIT)
        top = brentq(lambda c: tpp_of(law, state.tau, c) - _CURVE_END, 0.0, 60.0 + _most(law))
        return Curve.of_cuts(study, law, state, np.linspace(0.0, float(top), points))
    states = _states(law, chosen, points)
    return Curve.of(states, study, "" if states else _NO_FIT)


def marginal_screening(
    study: Study, *, fdp: float | None = None, tpp: float | None = None
) -> Prediction:
    """
    Predict the comparator that fits nothing: z-scores of one candidate at a time, cut.

    Asymptotic, for iid Gaussian columns. What the other actives add counts as noise:
    tau^2 = sigma^2 + E B^2 / sampling ratio.

    Examples
    --------
    >>> from engine.demo import DEMO_STUDY
    >>> from engine.prediction import marginal_screening
    >>> round(marginal_screening(DEMO_STUDY, fdp=0.3).tpp, 3)
    0.087
    """
    _check_study(study)
    law = signal_law(study)
    goals = _goals("two-stage", fdp, tpp, None)
    tau = math.sqrt(law.noise**2 + law.energy / law.delta)
    cut, reason = _cut(law, tau, "two-stage", goals)
    return predicted(study, law, tau, "none", "marginal", cut, reason)


def prediction_optimal_lasso(study: Study) -> Prediction:
    """
    Predict the lasso that cross-validation aims at: smallest tau, nonzero in the fit.

    Asymptotic, for iid Gaussian columns.

    Examples
    --------
    >>> from engine.demo import DEMO_STUDY
    >>> from engine.prediction import prediction_optimal_lasso
    >>> best = prediction_optimal_lasso(DEMO_STUDY)
    >>> round(best.tpp, 3), round(best.fdp, 3)
    (0.449, 0.574)
    """
    _check_study(study)
    law = signal_law(study)
    state = quietest(law, Lasso())
    if state is None:
        return none_predicted(study, "lasso", "nonzero", _NO_FIT)
    return predicted(study, law, state, "lasso", "nonzero", None, "")


# ---- at the door


def _check_study(study: Any) -> None:
    if not isinstance(study, Study):
        raise ValueError(f"study must be a Study, not {shown(study)}")


def _check_choice(name: str, value: Any, choices: Any) -> None:
    if not isinstance(value, str) or value not in choices:
        raise ValueError(f"{name} must be one of {', '.join(choices)}, not {shown(value)}")


def _goals(selection: str, fdp: Any, tpp: Any, lam: Any) -> dict[str, float]:
    """The goals that are given, checked; exactly what the selection needs."""
    _check_choice("selection", selection, SELECTIONS)
    given: list[tuple[str, Quantity, Any]] = [
        ("fdp", FDP, fdp), ("tpp", TPP, tpp), ("lam", LAMBDA, lam),
    ]  # fmt: skip
    goals = {n: q.check(value, n) for n, q, value in given if value is not None}
    targets = [name for name in goals if name != "lam"]
    if selection == "nonzero" and len(goals) != 1:
        raise ValueError(f"one of fdp, tpp and lam must be given, not {len(goals)} of them")
    if selection != "nonzero" and len(targets) != 1:
        raise ValueError(f"one of fdp and tpp must be given, not {len(targets)} of them")
    return goals


def _penalty(
    study: Study, penalty: Any, levels: Any, share: Any, ramp_level: Any, weights: Any
) -> Penalty:
    _check_choice("penalty", penalty, PENALTIES)
    family = PENALTIES[penalty]
    stated = {"levels": levels, "share": share, "ramp_level": ramp_level, "weights": weights}
    given = {name: value for name, value in stated.items() if value is not None}
    for name in given:
        if name not in family.parameters:
            raise ValueError(f"{name} must be left out for {penalty}, not {shown(given[name])}")
    if given or not family.tunable:
        for name in family.parameters:
            if name not in given:
                raise ValueError(f"{name} must be given for {penalty}, not None")
    checked = {name: _CHECKS[name](value) for name, value in given.items()}
    return family.make(study.sampling_ratio, **checked)


def _check_levels(levels: Any) -> tuple[float, float]:
    if not isinstance(levels, tuple | list | np.ndarray) or len(levels) != 2:
        raise ValueError(f"levels must be two numbers, not {shown(levels)}")
    upper, lower = (LEVEL.check(value, f"levels[{i}]") for i, value in enumerate(levels))
    if not upper >= lower or upper == 0.0:
        raise ValueError(f"levels must fall and not both be 0, not {shown((upper, lower))}")
    return upper, lower


_CHECKS: dict[str, Callable[[Any], Any]] = {
    "levels": _check_levels,
    "share": lambda value: RANK_SHARE.check(value, "share"),
    "ramp_level": lambda value: RAMP_LEVEL.check(value, "ramp_level"),
    "weights": check_weights,
}


# ---- the searches


def _most(law: SignalLaw) -> float:
    return float(law.sizes.max()) / law.noise


def _path(law: SignalLaw, penalty: Penalty) -> list[Stretch]:
    return stretches(law, penalty, np.linspace(0.0, top_threshold(law, _FEWEST), _LOOKS))


def _nonzero(
    study: Study, law: SignalLaw, penalty: Penalty, goals: dict[str, float]
) -> Prediction:
    ((name, goal),) = goals.items()
    if name == "lam":
        state, reason = _at_strength(study, law, penalty, goal)
    else:
        path = _path(law, penalty)
        found = crossings(law, path, penalty, lambda state: getattr(state, name) - goal)
        # At one FDP the largest TPP; at one TPP the lowest FDP.
        best = (lambda s: -s.tpp) if name == "fdp" else (lambda s: s.fdp)
        state = min(found, key=best, default=None)
        values = [[getattr(s, name) for s in stretch] for stretch in path]
        reason = "" if state else _why(f"{name.upper()} {goal:g}", goal, values)
    if state is None:
        return none_predicted(study, penalty.key, "nonzero", reason)
    return predicted(study, law, state, penalty.key, "nonzero", None, "")


def _at_strength(
    study: Study, law: SignalLaw, penalty: Penalty, lam: float
) -> tuple[State | None, str]:
    def strength(state: State) -> float:
        unit = largest_weight(state.shape, study.candidates)
        return state.tau * state.calibration * unit

    path = _path(law, penalty)
    found = crossings(law, path, penalty, lambda state: strength(state) - lam)
    if found:
        return max(found, key=lambda state: state.tpp), ""
    values = [[strength(state) for state in stretch] for stretch in path]
    return None, _why(f"lambda {lam:g}", lam, values)


def _why(what: str, goal: float, values: list[list[float]]) -> str:
    every = [value for stretch in values for value in stretch]
    if not every:
        return _NO_FIT
    least, most = min(every), max(every)
    if least < goal < most:
        return f"{what} lies inside a jump of the path: no strength of this penalty gives it"
    word = "lambda" if what.startswith("lambda") else what.split()[0]
    return (
        f"{what} is outside what the admissible strengths give: "
        f"{word} runs from {least:.4g} to {most:.4g}"
    )


def _cut(
    law: SignalLaw, tau: float, selection: str, goals: dict[str, float]
) -> tuple[float | None, str]:
    """The cut that meets the target, or why there is none."""
    high = float(law.sizes.max()) / tau + 40.0
    nulls = 1.0 - law.eps
    if "tpp" in goals:
        if goals["tpp"] == 1.0:
            return 0.0, ""
        value = goals["tpp"]
        return _root(lambda c: tpp_of(law, tau, c) - value, high), ""
    target = goals["fdp"] * (nulls if selection == "two-stage-bh" else 1.0)
    if target >= nulls:
        return None, f"FDP {target:g} is not below that of listing every candidate, {nulls:g}"
    return _root(lambda c: fdp_of(law, tpp_of(law, tau, c), c) - target, high), ""


def _root(falling: Callable[[float], float], high: float) -> float:
    while falling(high) > 0.0:
        high *= 2.0
    return float(brentq(falling, 0.0, high, xtol=_CUT_ACCURACY, rtol=_CUT_ACCURACY))


def _states(law: SignalLaw, penalty: Penalty, points: int) -> list[State]:
    top = top_threshold(law, _CURVE_END)
    low, high = 0.0, top
    for looks in (9, 5, 5):  # the smallest admissible threshold, closer each time
        tried = np.linspace(low, high, looks)
        states = settle_all(law, penalty, tried)
        i = next((i for i, state in enumerate(states) if state is not None), None)
        if i is None:
            return []
        low, high = float(tried[max(i - 1, 0)]), float(tried[i])
        if i == 0:
            break
    grid = settle_all(law, penalty, np.linspace(high, top, points))
    return [state for state in grid if state is not None]
