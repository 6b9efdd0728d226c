"""State evolution: what a penalty gives for a known signal at a zero threshold.

Source: *The LASSO risk for Gaussian matrices*, IEEE Trans. Inf. Theory 58(4), 2012, and
*Algorithmic analysis and statistical estimation of SLOPE via AMP*, IEEE Trans. Inf. Theory 67,
2021. The effective noise tau solves, with pi the coefficients over tau,

    tau^2 = sigma^2 + tau^2 / delta E [eta(pi + Z) - pi]^2,

and the weights are tau (1 - E eta' / delta) times the normalised ones, which must not be
negative. Solved here for 1/tau, from 0 (the noise of the fit without bound) to 1/sigma.
"""

from dataclasses import dataclass, field

import numpy as np
from scipy.optimize import brentq

from engine.normal import Array, null_risk, selection, tail
from engine.penalties.lasso import Lasso, soft_moments
from engine.penalties.penalty import Branched, Law, Penalty, Shape, Tuned
from engine.signal import SignalLaw

__all__ = ["State", "fdp_of", "law_at", "settle", "settle_all", "tpp_of"]

# Smallest 1/tau looked at, as a share of 1/sigma: a fit with a thousand times more noise than
# the runs have has none of the signal left.
_LEAST = 1e-3
_ACCURACY = 1e-8

# Tuning and tau take turns; a tau that moves less is found, for the error squares each turn.
_ROUNDS, _SETTLED = 8, 1e-5

_ROUNDING = 1e-6  # of E eta' / delta on the nodes


@dataclass(frozen=True, eq=False)
class State:
    """What the fit tends to at a zero threshold.

    Attributes
    ----------
    threshold : float
        In units of tau.
    tau : float
        Effective noise, on columns of length one.
    shape : Shape
        The shrinkage, with its risk and slope.
    calibration : float
        1 - E eta' / delta, at least 0.
    tpp, fdp : float
        Of 'nonzero in the fit'.
    penalty : Penalty
        The family's member: what was stated, or what tuning chose.
    """

    threshold: float
    tau: float
    shape: Shape = field(repr=False)
    calibration: float
    tpp: float
    fdp: float
    penalty: Penalty = field(repr=False)


def law_at(law: SignalLaw, tau: float) -> Law:
    """Return the law in units of tau."""
    return Law(law.sizes / tau, law.masses)


def tpp_of(law: SignalLaw, tau: float, threshold: float) -> float:
    """Share of the actives whose estimate before shrinkage passes the threshold."""
    passed = selection(law.sizes / tau, np.asarray(threshold))
    return float(law.masses @ passed) / law.eps


def fdp_of(law: SignalLaw, tpp: float, threshold: float) -> float:
    """False share of the estimates that pass the threshold."""
    nulls = 2.0 * (1.0 - law.eps) * float(tail(np.asarray(threshold)))
    listed = nulls + law.eps * tpp
    return nulls / listed if listed > 0.0 else 0.0


def settle(
    law: SignalLaw, penalty: Penalty, threshold: float, near: State | None = None
) -> State | None:
    """Return the state at a zero threshold; None where the penalty has no fit with it.

    `near`, the state at a threshold close by, saves time.

    Examples
    --------
    >>> from engine.demo import DEMO_STUDY
    >>> from engine.evolution import settle
    >>> from engine.penalties.lasso import Lasso
    >>> from engine.signal import signal_law
    >>> round(settle(signal_law(DEMO_STUDY), Lasso(), 1.5).tpp, 3)
    0.424
    >>> settle(signal_law(DEMO_STUDY), Lasso(), 0.5) is None
    True
    """
    if isinstance(penalty, Lasso):
        return settle_all(law, penalty, np.array([threshold]))[0]
    guess = 0.5 / law.noise if near is None else 1.0 / near.tau
    if not isinstance(penalty, Tuned):
        for branch in penalty.branches if isinstance(penalty, Branched) else (penalty,):
            inverse = _inverse(law, branch, threshold, guess)
            state = None if inverse is None else _state(law, branch, threshold, inverse)
            if state is not None:
                return state
        return None
    best: Penalty | None = None if near is None else near.penalty
    for _ in range(_ROUNDS):
        best = penalty.tune(threshold, law_at(law, 1.0 / guess), best)
        inverse = _inverse(law, best, threshold, guess)
        if inverse is None:
            return None
        moved, guess = abs(inverse - guess), inverse
        if moved <= _SETTLED * inverse:
            break
    return None if best is None else _state(law, best, threshold, guess)


def _inverse(law: SignalLaw, penalty: Penalty, threshold: float, guess: float) -> float | None:
    """1/tau of the fixed point: secant steps from a guess, else a bracket."""

    def surplus(inverse: float) -> float:
        risk = penalty.shape(threshold, law_at(law, 1.0 / inverse)).risk
        return (inverse * law.noise) ** 2 + risk / law.delta - 1.0

    least, most = _LEAST / law.noise, 1.0 / law.noise
    before, f_before = guess, surplus(guess)
    s = min(guess * (0.99 if f_before > 0.0 else 1.01), most)
    for _ in range(8):
        value = surplus(s)
        if not value > f_before and not value < f_before:
            break
        before, f_before, s = s, value, s - value * (s - before) / (value - f_before)
        if not least < s <= most:
            break
        if abs(s - before) <= _ACCURACY * s:
            return s
    if not surplus(least) < 0.0:
        return None
    return float(brentq(surplus, least, most, xtol=_ACCURACY * most, rtol=_ACCURACY))


def settle_all(law: SignalLaw, penalty: Penalty, thresholds: Array) -> list[State | None]:
    """Return the state at each zero threshold; the lasso in one pass."""
    if not isinstance(penalty, Lasso):
        states: list[State | None] = []
        near = None
        for threshold in thresholds.tolist():
            states.append(settle(law, penalty, threshold, near))
            near = states[-1] or near
        return states
    inverses = _soft_inverses(law, thresholds)
    at = inverses[:, None] * law.sizes
    risk, slope = soft_moments(thresholds, at, law.masses)
    found = selection(at, thresholds[:, None]) @ law.masses / law.eps
    rows = zip(thresholds.tolist(), inverses.tolist(), risk.tolist(), slope.tolist(),
               found.tolist(), strict=True)  # fmt: skip
    return [_soft_state(law, *row) for row in rows]


def _soft_state(
    law: SignalLaw, threshold: float, inverse: float, risk: float, slope: float, tpp: float
) -> State | None:
    calibration = 1.0 - slope / law.delta
    if not calibration >= 0.0:  # nan too
        return None
    shape = Shape(risk, slope, lambda ranks, p: np.full(ranks.shape, threshold))
    fdp = fdp_of(law, tpp, threshold)
    return State(threshold, 1.0 / inverse, shape, calibration, tpp, fdp, Lasso())


def _state(law: SignalLaw, penalty: Penalty, threshold: float, inverse: float) -> State | None:
    tau = 1.0 / inverse
    shape = penalty.shape(threshold, law_at(law, tau))
    calibration = 1.0 - shape.slope / law.delta
    if calibration < -_ROUNDING or not shape.admissible:
        return None
    tpp = tpp_of(law, tau, threshold)
    fdp = fdp_of(law, tpp, threshold)
    return State(threshold, tau, shape, max(calibration, 0.0), tpp, fdp, penalty)


def _soft_inverses(law: SignalLaw, thresholds: Array) -> Array:
    """1/tau of the lasso at each threshold; nan where there is none.

    The risk of soft thresholding rises with every size, so that the equation has one root:
    Newton's steps from that of screening, halving whenever one leaves the interval.
    """
    inverses = np.full(thresholds.shape, np.nan)
    possible = null_risk(thresholds) < law.delta  # else the noise of the fit has no bound
    thresholds = thresholds[possible]
    low, high = np.zeros_like(thresholds), np.full_like(thresholds, 1.0 / law.noise)
    s = np.full_like(thresholds, (law.noise**2 + law.energy / law.delta) ** -0.5)
    at = thresholds[:, None]
    for _ in range(60):
        sizes = s[:, None] * law.sizes
        value = (s * law.noise) ** 2 - 1.0
        value += soft_moments(thresholds, sizes, law.masses)[0] / law.delta
        low, high = np.where(value < 0.0, s, low), np.where(value < 0.0, high, s)
        kept = (tail(-at - sizes) - tail(at - sizes)) @ (law.masses * law.sizes**2)
        step = value / (2.0 * s * (law.noise**2 + kept / law.delta))
        following = s - step
        s_next = np.where((following > low) & (following < high), following, 0.5 * (low + high))
        moved = np.abs(s_next - s)
        s = s_next
        if np.all((moved <= _ACCURACY * s) | (s < _LEAST / law.noise)):
            break
    inverses[possible] = np.where(s < _LEAST / law.noise, np.nan, s)
    return inverses
