"""Debiased fits and cuts: definitions, limits, refusals."""

import dataclasses
import re

import numpy as np
import pytest
from scipy.stats import false_discovery_control, norm

from engine.fit import cut, debias, fit
from engine.fit.two_stage import Debiased
from tests.engine.fit.problems import study, weights_of


@pytest.fixture(scope="module")
def found():
    return fit(*study(100, 150), 2.0 * weights_of("ramp", 150), intercept=False)


def scores(z):
    return Debiased(np.array(z, float), 1.0, 0, 0.0, "")


def test_the_formulas(found):
    X, y = study(100, 150)
    debiased = debias(found)
    df = np.unique(np.abs(found.coefficients[found.support])).size
    r = y - X @ found.coefficients
    tau = np.linalg.norm(r) / (10.0 * (1.0 - df / 100))
    assert (debiased.df, debiased.df_per_run, debiased.caution) == (df, df / 100, "")
    assert debiased.tau == pytest.approx(tau, rel=1e-10)
    z = (found.coefficients + X.T @ r / (1.0 - df / 100)) / tau
    assert debiased.z == pytest.approx(z, abs=1e-8)


def test_an_empty_fit_leaves_marginal_scores():
    X, y = study(100, 150)
    debiased = debias(fit(X, y, 1e3, intercept=False))
    assert (debiased.df, debiased.tau) == (0, pytest.approx(np.linalg.norm(y) / 10.0))
    assert debiased.z == pytest.approx(X.T @ y / debiased.tau, abs=1e-10)


def test_an_intercept_costs_one_run():
    """A study whose mean is set apart by a rotation is one of a run less."""
    X, y = study(101, 60)
    whole = debias(fit(X, y + 5.0, 2.0))
    centre = np.eye(101) - 1.0 / 101
    rotation = np.linalg.svd(centre)[0][:, :100].T  # (100, 101): all but the mean
    lengths = np.linalg.norm(centre @ X, axis=0)
    apart = debias(fit(rotation @ X / lengths, rotation @ y, 2.0, intercept=False))
    assert whole.z == pytest.approx(apart.z, abs=1e-5)
    assert whole.tau == pytest.approx(apart.tau, abs=1e-6)


def test_scores_have_no_unit():
    X, y = study(60, 90)
    plain, large = debias(fit(X, y, 2.0)), debias(fit(X, 100.0 * y, 200.0))
    assert large.z == pytest.approx(plain.z, abs=1e-5)
    assert large.tau == pytest.approx(100.0 * plain.tau, rel=1e-6)


def test_a_cut_at_a_threshold(found):
    debiased = debias(found)
    chosen = cut(debiased, threshold=2.5)
    assert chosen.selected.tolist() == np.flatnonzero(np.abs(debiased.z) > 2.5).tolist()
    assert chosen.threshold == 2.5
    # The cut runs over all candidates, those that are zero in the fit too.
    assert cut(debiased, threshold=0).selected.size == 150 > found.support.size


@pytest.mark.parametrize("level", [0.01, 0.1, 0.3, 0.9])
@pytest.mark.parametrize("strength", [0.0, 1.0, 3.0])
def test_benjamini_hochberg_is_that_of_scipy(level, strength):
    z = np.random.default_rng(8).normal(size=400)
    z[:60] += strength
    adjusted = false_discovery_control(2.0 * norm.sf(np.abs(z)))
    chosen = cut(scores(z), level=level)
    assert chosen.selected.tolist() == np.flatnonzero(adjusted <= level).tolist()
    assert (np.abs(z[chosen.selected]) >= chosen.threshold).all()


def test_nothing_passes_the_first_critical_value():
    chosen = cut(scores(np.zeros(10)), level=0.1)
    assert chosen.selected.size == 0
    assert chosen.threshold == pytest.approx(norm.isf(0.1 / 20))


def test_a_fit_near_its_last_degree_of_freedom_is_cautioned():
    X, y = study(40, 80)
    for weight in np.geomspace(1.0, 1e-3, 12):
        found = fit(X, y, weight, intercept=False)
        if 36 < found.support.size < 40:
            break
    expected = f"tau is unstable: {found.support.size} distinct magnitudes in a fit to 40 runs"
    assert debias(found).caution == expected


def test_a_fit_without_residuals_is_cautioned():
    debiased = debias(fit([[1.0, 0.0], [0.0, 1.0], [0.0, 0.0]], [0.0, 0.0, 0.0], 1.0,
                          intercept=False))  # fmt: skip
    assert debiased.caution == "tau is 0: the fit leaves no residuals"
    assert cut(debiased, level=0.1).selected.size == 0


def test_results_are_frozen(found):
    with pytest.raises(dataclasses.FrozenInstanceError):
        debias(found).tau = 0.0


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: debias(3), "fit must be what fit or path returned, not 3"),
        (lambda: debias(fit([[2.0]], [3.0], 1.0, intercept=False)),
         "fit must have fewer distinct magnitudes than runs to be debiased, not 1 with 1 runs"),
        (lambda: cut([1.0], level=0.1), "debiased must be what debias returned, not [1.0]"),
        (lambda: cut(scores([1.0])),
         "cut must have either a threshold or a level, not neither"),
        (lambda: cut(scores([1.0]), threshold=1.0, level=0.1),
         "cut must have either a threshold or a level, not both"),
        (lambda: cut(scores([1.0]), threshold=-1.0),
         "threshold must be a finite number at least 0, not -1"),
        (lambda: cut(scores([1.0]), level=1.0),
         "level must be a finite number above 0 and below 1, not 1"),
    ],
)  # fmt: skip
def test_refusals(call, message):
    with pytest.raises(ValueError, match=f"^{re.escape(message)}$"):
        call()
