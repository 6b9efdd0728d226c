"""The ratios that targets need, against the boundaries they are read backwards from."""

import numpy as np
import pytest

from engine import lasso_boundary, power_limit, two_level_closed_form
from engine.limits.needed import closed_form_needs, lasso_needs, studies_of_limit


@pytest.fixture(scope="module")
def targets():
    """TPP (a tenth of them 1), FDP below that of random picks, sparsity."""
    rng = np.random.default_rng(0)
    n = 4000
    u = np.where(rng.random(n) < 0.1, 1.0, rng.uniform(0.01, 1.0, n))
    eps = rng.uniform(0.001, 0.97, n)
    return u, rng.uniform(0.001, 0.99, n) * (1.0 - eps), eps


def test_the_lasso_meets_the_target_from_there_on_and_not_before(targets):
    u, q, eps = targets
    ratio = lasso_needs(u, q, eps)
    # A part in 1e7 of the ratio, times the steepest slope seen, is below 1e-5 of the FDP.
    assert np.all(lasso_boundary(u, ratio * (1.0 + 1e-7), eps) <= q * (1.0 + 1e-5))
    before = lasso_boundary(u, ratio * (1.0 - 1e-6), eps)
    assert np.all(np.isnan(before) | (before > q))


def test_the_closed_form_meets_the_target_from_there_on_and_not_before(targets):
    u, q, eps = targets
    lasso = lasso_needs(u, q, eps)
    ratio = closed_form_needs(u, q, eps, lasso)
    assert np.all(ratio <= lasso)
    assert np.any(ratio < 0.9 * lasso)
    assert np.all(two_level_closed_form(u, ratio * (1.0 + 1e-7), eps) <= q * (1.0 + 1e-5))
    assert np.all(two_level_closed_form(u, ratio * (1.0 - 1e-6), eps) > q * (1.0 - 1e-9))


def test_what_picking_at_random_meets_needs_no_runs():
    eps = np.array([0.3, 0.31, 0.9])
    lasso = lasso_needs(0.8, 0.7, eps)
    assert lasso.tolist() == [0.0, 0.0, 0.0]
    assert closed_form_needs(0.8, 0.7, eps, lasso).tolist() == [0.0, 0.0, 0.0]


@pytest.mark.parametrize("limit", [0.05, 0.2, 0.4, 0.6, 0.8, 0.99])
def test_lines_of_equal_power_limit(limit):
    ratio, sparsity = studies_of_limit(limit)
    assert np.all(np.diff(ratio) > 0.0)
    assert np.all(np.diff(sparsity) > 0.0)
    assert power_limit(ratio, sparsity) == pytest.approx(limit, abs=1e-9)
