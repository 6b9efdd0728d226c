"""Fits against the outside world: other solvers, known values, facts of the trade.

"Computed": by two independent programs, not by this project. "Simulated": by a program that is
not part of this project, with a general-purpose lasso. "Practice": a fact of the trade, no
source.
"""

import cvxpy as cp
import numpy as np
import pytest
from scipy.special import ndtri
from sklearn.linear_model import Lasso

from engine.fit import cut, debias, fit
from engine.fit.prox import prox
from tests.engine.fit.problems import WEIGHTS, study, weights_of


class TestScikitLearn:
    """Its lasso minimises 1/(2n) ||y - c - X b||^2 + alpha ||b||_1, columns as given.

    It is run to a dual gap of 1e-12 ||y||^2; the objective is strongly convex on the support
    (modulus above .1 on unit-length columns), so coefficients agree to about
    sqrt(2e-12 ||y||^2 / .1), below 2e-4 on unit-length columns here. Hence 2e-4.
    """

    def theirs(self, X, y, alpha, intercept):
        model = Lasso(alpha=alpha, tol=1e-12, max_iter=100_000, fit_intercept=intercept)
        return model.fit(X, y)

    @pytest.mark.parametrize("intercept", [True, False])
    @pytest.mark.parametrize("shape", [(80, 160), (160, 80)])
    def test_columns_as_given_and_the_mean_loss(self, shape, intercept):
        X, y = study(*shape)
        y = y + 3.0 * intercept
        theirs = self.theirs(X, y, 0.01, intercept)
        ours = fit(X, y, 0.01, columns="as-given", loss="mean", intercept=intercept)
        assert ours.coefficients == pytest.approx(theirs.coef_, abs=2e-4)
        assert ours.intercept == pytest.approx(theirs.intercept_, abs=2e-4)
        assert ours.support.tolist() == np.flatnonzero(np.abs(theirs.coef_) > 2e-4).tolist()

    def test_alpha_is_lambda_over_the_root_of_the_runs(self):
        """Unit-variance columns and 1/(2n): alpha = lambda / sqrt(n), b = beta / sqrt(n)."""
        X, y = study(80, 160)
        strength = 1.3
        X, y = X - X.mean(axis=0), y - y.mean()
        X /= X.std(axis=0)
        theirs = self.theirs(X, y, strength / np.sqrt(80), False)
        ours = fit(X, y, strength, columns="unit-length")
        assert ours.coefficients / np.sqrt(80) == pytest.approx(theirs.coef_, abs=2e-5)
        per_run = fit(X, y, strength / np.sqrt(80), columns="unit-variance", loss="mean")
        assert per_run.coefficients == pytest.approx(theirs.coef_, abs=2e-5)


def sorted_l1(b, weights):
    """The penalty as a sum of largest parts: sum_k (w_k - w_(k+1)) (k largest |b|)."""
    drops = weights - np.append(weights[1:], 0.0)
    parts = [d * cp.sum_largest(cp.abs(b), k + 1) for k, d in enumerate(drops) if d > 1e-12]
    return cp.sum(cp.hstack(parts))


class TestConicSolver:
    @pytest.mark.parametrize("kind", WEIGHTS)
    def test_sorted_l1(self, kind):
        X, y = study(30, 40, seed=2)
        weights = 1.5 * weights_of(kind, 40)
        b = cp.Variable(40)
        objective = 0.5 * cp.sum_squares(y - X @ b) + sorted_l1(b, weights)
        problem = cp.Problem(cp.Minimize(objective))
        problem.solve(solver=cp.CLARABEL)
        ours = fit(X, y, weights, intercept=False)
        size = np.sort(np.abs(ours.coefficients))[::-1]
        value = 0.5 * np.sum((y - X @ ours.coefficients) ** 2) + weights @ size
        # Its own tolerances are 1e-8, of the objective; ours may only be lower.
        assert value <= problem.value + 1e-12 * value
        assert value == pytest.approx(problem.value, rel=1e-6)
        assert ours.coefficients == pytest.approx(b.value, abs=1e-3)
        large = np.flatnonzero(np.abs(b.value) > 1e-3)  # it returns no exact zeros
        assert ours.support.tolist() == large.tolist()

    def test_prox(self):
        rng = np.random.default_rng(4)
        v, weights = rng.normal(size=25), np.sort(rng.uniform(0.0, 0.6, 25))[::-1]
        x = cp.Variable(25)
        objective = 0.5 * cp.sum_squares(v - x) + sorted_l1(x, weights)
        cp.Problem(cp.Minimize(objective)).solve(solver=cp.CLARABEL)
        assert prox(v, weights) == pytest.approx(x.value, abs=1e-5)  # its accuracy


class TestPractice:
    """Facts of the trade (common practice, no source), on columns in general position."""

    @pytest.mark.parametrize("kind", WEIGHTS)
    @pytest.mark.parametrize("strength", [1.0, 0.1, 0.01])
    def test_at_most_as_many_magnitudes_as_runs(self, kind, strength):
        X, y = study(30, 150)
        found = fit(X, y, strength * weights_of(kind, 150), intercept=False)
        assert found.certified
        assert found.clusters.max() <= 30
        if kind == "lasso":
            assert found.support.size <= 30

    def test_a_sorted_l1_fit_may_select_more_than_there_are_runs(self):
        found = fit(*study(30, 150), 0.1 * weights_of("ramp", 150), intercept=False)
        assert found.support.size > 30

    def test_equal_weights_give_the_lasso(self):
        X, y = study(60, 100)
        rising = np.full(100, 1.2)
        rising[0] *= 1.0 + 1e-12  # equal up to what no fit can tell, so not the lasso's branch
        ours = fit(X, y, rising, intercept=False)
        theirs = Lasso(alpha=1.2 / 60, tol=1e-12, max_iter=100_000, fit_intercept=False)
        assert ours.coefficients == pytest.approx(theirs.fit(X, y).coef_, abs=2e-4)


def test_ramp_on_orthogonal_columns():
    """*SLOPE: adaptive variable selection via convex optimization*, Annals of Applied
    Statistics 9(3), 2015: on an orthogonal design FDR <= q (p - k) / p with the ramp.

    On such a design the fit is the proximal map of X'y. The mean FDP of 400 studies has a
    standard error of about .008 here: 4 of them on top of the bound, and the FDR is known to
    lie close below it, so not more than 6 under it.
    """
    p, k, q = 200, 20, 0.2
    weights = ndtri(1.0 - q * np.arange(1, p + 1) / (2 * p))
    # Computed: the ramp at ranks 1, 10, 100, 1000 of 1000, q = .1, to the digits printed.
    ranks = np.array([1, 10, 100, 1000])
    printed = [3.89059, 3.29053, 2.57583, 1.64485]
    assert ndtri(1.0 - 0.1 * ranks / 2000) == pytest.approx(printed, abs=5e-6)
    rng = np.random.default_rng(6)
    effects = np.zeros(p)
    effects[:k] = 4.0
    fdp = []
    for _ in range(400):
        selected = np.flatnonzero(prox(effects + rng.normal(size=p), weights))
        fdp.append(np.mean(selected >= k) if selected.size else 0.0)
    se = np.std(fdp) / 20.0
    bound = q * (p - k) / p
    assert bound - 6.0 * se <= np.mean(fdp) <= bound + 4.0 * se


def test_lasso_in_a_large_study():
    """Computed, and simulated by others: runs / candidates .5, sparsity .1, effect 4 on
    unit-length columns, noise 1, normalised threshold 1.4: TPP .8605, FDP .6281; six draws at
    p = 2000 gave .845(10) and .631(5).

    tau and the strength follow from the formulas of *The LASSO risk for Gaussian matrices*,
    IEEE Trans. Inf. Theory 58(4), 2012; here lambda = alpha tau (1 - selected share / delta)
    with the selected share eps TPP / (1 - FDP) and tau from TPP = P(|4/tau + Z| > alpha).
    Eight draws at p = 1000: single studies spread by some .04 in TPP and .02 in FDP, and the
    finite-size bias is up to .015, hence 4 standard errors plus .015.
    """
    p, alpha, tpp, fdp = 1000, 1.4, 0.8605, 0.6281
    tau = 4.0 / (alpha + ndtri(tpp))  # the other tail is below 1e-5
    strength = alpha * tau * (1.0 - 0.1 * tpp / (1.0 - fdp) / 0.5)
    found = []
    for seed in range(8):
        rng = np.random.default_rng(seed)
        X = rng.normal(size=(p // 2, p)) / np.sqrt(p // 2)
        y = 4.0 * X[:, : p // 10].sum(axis=1) + rng.normal(size=p // 2)
        one = fit(X, y, strength, columns="as-given", intercept=False)
        true = np.count_nonzero(one.support < p // 10)
        found.append((true / (p // 10), 1.0 - true / one.support.size))
    mean, se = np.mean(found, axis=0), np.std(found, axis=0, ddof=1) / np.sqrt(8)
    assert (np.abs(mean - (tpp, fdp)) < 4.0 * se + 0.015).all()


def test_two_stage_in_a_large_study():
    """Simulated by others with a general-purpose lasso, eight draws: n = 600, p = 2000, 100
    effects of 0.2 per standard deviation, noise 1, lasso then cut at a predicted FDP of .2:
    TPP .598(10), FDP .196(6) (predicted TPP .602).

    The threshold is the one at which nulls and actives give that FDP:
    2 Phi(-c) 1900 / (2 Phi(-c) 1900 + 60.2) = .2. Eight draws here; single studies spread by
    some .05, hence 4 standard errors of the difference of both means.
    """
    n, p, k = 600, 2000, 100
    threshold = -ndtri(0.2 * 60.2 / (0.8 * 1900) / 2.0)
    tpp, fdp = [], []
    for seed in range(8):
        rng = np.random.default_rng(seed)
        X = rng.normal(size=(n, p))
        y = 0.2 * X[:, :k].sum(axis=1) + rng.normal(size=n)
        # The strength of the smallest tau, 1.681, by the formulas cited above (alpha 1.461).
        debiased = debias(fit(X, y, 0.958, intercept=False, gap=1e-6))
        selected = cut(debiased, threshold=threshold).selected
        tpp.append(np.mean(np.isin(np.arange(k), selected)))
        fdp.append(np.mean(selected >= k))
    assert np.mean(tpp) == pytest.approx(0.598, abs=4.0 * np.hypot(0.05 / np.sqrt(8), 0.010))
    assert np.mean(fdp) == pytest.approx(0.196, abs=4.0 * np.hypot(0.05 / np.sqrt(8), 0.006))
