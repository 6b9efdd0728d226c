"""Predictions against values from outside, general-purpose programs and a naive search."""

import math

import numpy as np
import pytest
from scipy.optimize import lsq_linear
from sklearn.linear_model import Lasso as GeneralLasso

from engine import predict
from engine.evolution import settle
from engine.limits.least_risk import fold
from engine.normal import density
from engine.penalties.designed import Designed
from engine.penalties.lasso import Lasso
from engine.penalties.penalty import Law
from engine.penalties.ramp import critical_values
from engine.penalties.two_level import TunedTwoLevel
from engine.signal import signal_law
from engine.study import Effect, Study


def unit_length(delta, eps, size, candidates=2000):
    """A study whose effects have a size in noise units on columns of length one."""
    runs = round(delta * candidates)
    effect = Effect(size / math.sqrt(runs), 1.0)
    return Study("", runs, candidates, round(eps * candidates), 1.0, (effect,))


SPARSE = Study("", 600, 2000, 100, 1.0, (Effect(0.2, 1.0),))
DENSE = Study("", 600, 2000, 400, 1.0, (Effect(0.25, 1.0),))


# Computed by two independent programs, not by this project; also simulated at p = 3000.
def test_state_evolution_of_a_strong_signal():
    study = unit_length(0.8, 0.1, 4.0)
    state = settle(signal_law(study), Lasso(), 1.6)
    got = predict(study, "lasso", lam=state.threshold * state.tau * state.calibration)
    values = (got.tpp, got.fdp, got.tau, got.mse, got.lam)
    assert values == pytest.approx((0.9136, 0.5192, 1.3498, 0.6576, 1.6468), abs=6e-5)


# Computed by two independent programs, not by this project; simulated with a general-purpose
# lasso at p = 2000, six draws: .845(10), .631(5).
def test_state_evolution_of_a_middling_signal():
    state = settle(signal_law(unit_length(0.5, 0.1, 4.0)), Lasso(), 1.4)
    assert (state.tpp, state.fdp) == pytest.approx((0.8605, 0.6281), abs=6e-5)


# Computed by two independent programs, not by this project (three digits).
@pytest.mark.parametrize(
    ("study", "fdp", "penalty", "selection", "tpp"),
    [
        (SPARSE, 0.2, "lasso", "nonzero", 0.264),
        (SPARSE, 0.2, "lasso", "two-stage", 0.602),
        (DENSE, 0.5, "lasso", "nonzero", 0.325),
        (DENSE, 0.5, "designed", "nonzero", 0.337),
        (DENSE, 0.5, "lasso", "two-stage", 0.333),
        (DENSE, 0.5, "designed", "two-stage", 0.425),
    ],
)
def test_tpp_at_an_fdp(study, fdp, penalty, selection, tpp):
    assert predict(study, penalty, selection, fdp=fdp).tpp == pytest.approx(tpp, abs=6e-4)


# CHECKS: computed critical values of the ramp, from a published definition.
def test_critical_values_of_the_ramp():
    got = critical_values(0.1, np.array([1, 10, 100, 1000]), 1000)
    assert got == pytest.approx([3.89059, 3.29053, 2.57583, 1.64485], abs=6e-6)


def naive_tau(law, threshold):
    """Fixed point of the least risk over piecewise-linear shrinkages, by bounded least squares.

    eta rises over intervals of .1 with slopes in [0, 1]; integrals by the nodes of `fold`.
    """
    tau2 = law.noise**2 + law.energy / law.delta
    for _ in range(60):
        folded = fold(threshold, (law.sizes / math.sqrt(tau2)).tolist(), law.masses.tolist())
        edges = np.arange(threshold, folded.x[-1], 0.1)
        ramps = np.clip(folded.x[:, None] - edges, 0.0, 0.1)
        root = np.sqrt(folded.mass)
        done = lsq_linear(ramps * root[:, None], folded.mean * root, (0.0, 1.0))
        eta = ramps @ done.x
        risk = folded.energy + folded.mass @ (eta**2 - 2.0 * eta * folded.mean)
        following = law.noise**2 + tau2 * risk / law.delta
        if abs(following - tau2) < 1e-5 * tau2:
            break
        tau2 = following
    return math.sqrt(following)


@pytest.mark.parametrize("threshold", [0.8, 1.6])
def test_designed_is_what_a_naive_search_over_shrinkages_finds(threshold):
    law = signal_law(DENSE)
    # The search is restricted to kinks every .1: never lower, and hardly higher.
    naive = naive_tau(law, threshold)
    tau = settle(law, Designed(), threshold).tau
    assert tau <= naive * (1.0 + 1e-5)
    assert tau == pytest.approx(naive, rel=1e-3)


def test_two_level_is_what_a_naive_search_finds():
    """eta of every gap and height on a grid, its risk by a plain sum over z."""
    law, threshold = signal_law(DENSE), 1.1
    state = settle(law, TunedTwoLevel(law.delta), threshold)
    z = np.linspace(-9.0, 9.0, 2401)
    mass = density(z) * (z[1] - z[0])
    at = Law(law.sizes / state.tau, law.masses)
    least = math.inf
    for gap in np.linspace(0.0, 3.0, 31):
        for h in np.linspace(0.0, 2.5, 26):
            risk = 0.0
            for t, p in [(0.0, 1.0 - law.eps), (float(at.sizes[0]), law.eps)]:
                x = np.abs(t + z)
                low = np.clip(x - threshold, 0.0, h) + np.maximum(x - threshold - gap - h, 0.0)
                risk += p * float(mass @ (np.sign(t + z) * low - t) ** 2)
            least = min(least, risk)
    # The grid is coarse, so it is never lower but for the sum's error, and hardly higher.
    assert state.shape.risk <= least + 1e-6
    assert state.shape.risk == pytest.approx(least, abs=2e-4)


def test_ramp_keeps_the_bound_of_orthogonal_designs_when_runs_abound():
    """Published, from memory (Annals of Applied Statistics 9(3), 2015): FDR <= q (p - k)/p."""
    level = 0.2
    candidates, actives, gaps = 2000, 100, []
    for ratio in (20, 200, 2000):
        runs = ratio * candidates
        effect = Effect(3.5 / math.sqrt(runs), 1.0)
        study = Study("", runs, candidates, actives, 1.0, (effect,))
        # Weights of the bound: noise times the critical values.
        lam = float(critical_values(level, np.ones(1), candidates)[0])
        got = predict(study, "ramp", lam=lam, ramp_level=level)
        gaps.append(got.fdp - level * (1.0 - actives / candidates))
    assert gaps[0] > gaps[1] > gaps[2]
    assert gaps[2] < 1e-3  # tau exceeds the noise by a share of 1 / ratio


def drawn(study, seed):
    rng = np.random.default_rng(seed)
    n, p, k = study.runs, study.candidates, study.actives
    X = rng.normal(size=(n, p)) / math.sqrt(n)
    truth = np.zeros(p)
    truth[:k] = study.effects[0].size * math.sqrt(n)
    return X, truth, X @ truth + study.noise_sd * rng.normal(size=n)


def test_lasso_and_two_stage_against_a_general_purpose_lasso():
    """Mean of six draws at p = 2000: within 4 standard errors, and .015 of finite-p bias."""
    alone = predict(SPARSE, "lasso", fdp=0.4)
    staged = predict(SPARSE, "lasso", "two-stage", fdp=0.2)
    rows = []
    for seed in range(6):
        X, truth, y = drawn(SPARSE, seed)
        row = []
        for prediction in (alone, staged):
            fit = GeneralLasso(
                prediction.lam / len(y), fit_intercept=False, tol=1e-6, max_iter=20_000
            ).fit(X, y)
            chosen = fit.coef_ != 0.0
            if prediction is staged:
                r = y - X @ fit.coef_
                room = 1.0 - np.count_nonzero(chosen) / len(y)
                tau = np.linalg.norm(r) / math.sqrt(len(y)) / room
                chosen = np.abs(fit.coef_ + X.T @ r / room) > staged.cut * tau
            true = np.count_nonzero(chosen & (truth != 0.0))
            row += [true / SPARSE.actives, 1.0 - true / np.count_nonzero(chosen)]
        rows.append(row)
    means = np.mean(rows, axis=0)
    errors = np.std(rows, axis=0, ddof=1) / math.sqrt(len(rows))
    wanted = np.array([alone.tpp, alone.fdp, staged.tpp, staged.fdp])
    assert (np.abs(means - wanted) <= 4.0 * errors + 0.015).all(), (means, wanted, errors)
