"""The lasso boundary: its equation, its largest root, its ends, and its witness."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import lasso_boundary, power_limit
from engine.limits.lasso import (
    fdp_at,
    lasso_witness,
    least_threshold,
    tpp_at,
    zero_threshold,
)
from engine.limits.transition import threshold_at_ratio
from engine.normal import null_risk, selection

ratios = st.floats(math.log(0.01), math.log(20.0)).map(math.exp)
sparsities = st.floats(math.log(0.0005), math.log(0.98)).map(math.exp)


@settings(max_examples=150, deadline=None)
@given(st.floats(0.001, 0.999), ratios, sparsities)
def test_the_threshold_meets_the_tpp(part, ratio, eps):
    u = np.array(part * power_limit(ratio, eps))
    t = zero_threshold(u, np.array(ratio), np.array(eps))
    assert tpp_at(t, np.array(ratio), np.array(eps)) == pytest.approx(float(u), rel=1e-10)
    assert t >= least_threshold(np.array(ratio), np.array(eps))
    assert lasso_boundary(float(u), ratio, eps) == float(fdp_at(t, u, np.array(eps)))


@pytest.mark.parametrize(("ratio", "eps"), [(0.05, 0.1), (0.3, 0.2), (0.7, 0.9), (3.0, 0.5)])
def test_from_the_least_threshold_on_the_tpp_falls(ratio, eps):
    low = float(least_threshold(np.array(ratio), np.array(eps)))
    t = np.linspace(low, low + 8.0, 4000)
    assert np.all(np.diff(tpp_at(t, np.full_like(t, ratio), np.full_like(t, eps))) < 0.0)


def test_at_its_power_limit_the_threshold_is_that_of_the_transition():
    ratio, eps = np.array(0.3), np.array(0.2)
    t = zero_threshold(np.array(power_limit(0.3, 0.2)), ratio, eps)
    # A stationary point of u(t): its place is known to the square root of the rounding.
    assert t == pytest.approx(float(threshold_at_ratio(ratio)), abs=1e-6)


def test_roots_beyond_the_power_limit_are_no_points():
    # The published equation goes on to have roots up to a TPP of 0.593 here.
    limit = power_limit(0.3, 0.2)
    assert np.all(np.isnan(lasso_boundary([limit, limit + 1e-9, 0.58, 0.593, 1.0], 0.3, 0.2)))


@pytest.mark.parametrize("u", [1e-12, 1e-6, 1e-3])
def test_small_tpp_has_a_large_threshold(u):
    # u(t) tends to ratio / (eps (1 + t^2)); at 1e-12 no fixed bracket holds t = 1.4e6.
    t = float(zero_threshold(np.array(u), np.array(1.0), np.array(0.5)))
    assert t == pytest.approx(math.sqrt(1.0 / (0.5 * u) - 1.0), rel=1e-6)
    assert lasso_boundary(u, 1.0, 0.5) < 1e-100


@settings(max_examples=100, deadline=None)
@given(st.floats(0.01, 0.999), ratios, sparsities)
def test_the_witness_attains_the_boundary(part, ratio, eps):
    u = part * power_limit(ratio, eps)
    found = lasso_witness(u, ratio, eps)
    t = found.zero_threshold
    assert found.fdp == lasso_boundary(u, ratio, eps)
    # Risk and share found, from the moments of its two kinds of actives.
    tiny, huge = found.law.shares
    assert found.law.sizes == (0.0, math.inf)
    chance = float(selection(np.array(0.0), np.array(t)))
    assert tiny * chance + huge == pytest.approx(u, rel=1e-9)
    risk = (1.0 - eps * huge) * float(null_risk(np.array(t))) + eps * huge * (1.0 + t * t)
    assert risk == pytest.approx(ratio, rel=1e-9)
    assert found.risk == pytest.approx(ratio, rel=1e-9)
    assert found.slope <= ratio * (1.0 + 1e-9)  # at most as many found as runs
    assert np.all(found.normalised_weights(7) == t)


def test_beyond_the_power_limit_there_is_no_witness():
    message = "^tpp must be below the power limit, 0.567603 here, not 0.6$"
    with pytest.raises(ValueError, match=message):
        lasso_witness(0.6, 0.3, 0.2)


def test_a_witness_is_of_one_point():
    with pytest.raises(ValueError, match="^tpp must be a finite number .*, not"):
        lasso_witness([0.1, 0.2], 0.3, 0.2)
