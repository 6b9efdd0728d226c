"""The closed form: it joins the lasso, and a two-level shrinkage does reach it."""

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.special import ndtri

from engine import critical_sparsity, lasso_boundary, power_limit, two_level_closed_form
from engine.limits.transition import threshold_at_ratio
from engine.limits.two_level_moments import risk_and_slope, selected

ratios = st.floats(math.log(0.01), math.log(0.98)).map(math.exp)
parts = st.floats(0.01, 0.99)


def dense(ratio, part):
    """A sparsity between the transition and 1."""
    eps_star = critical_sparsity(ratio)
    assume(eps_star < 0.97)
    return eps_star + part * (0.98 - eps_star)


@settings(max_examples=100, deadline=None)
@given(ratios, parts, parts)
def test_beyond_the_power_limit_nulls_are_found_in_proportion(ratio, part, beyond):
    eps, eps_star = dense(ratio, part), critical_sparsity(ratio)
    limit = power_limit(ratio, eps)
    u = limit + beyond * (1.0 - limit)
    fdp = two_level_closed_form(u, ratio, eps)
    nulls = fdp * eps * u / ((1.0 - fdp) * (1.0 - eps))
    # Rounding of 1 - fdp is what the quotient multiplies.
    assert nulls == pytest.approx((eps * u - eps_star) / (eps - eps_star), rel=1e-7)


@settings(max_examples=60, deadline=None)
@given(ratios, parts)
def test_it_joins_the_lasso_at_the_power_limit(ratio, part):
    eps = dense(ratio, part)
    limit = power_limit(ratio, eps)
    # Close to the transition the limit is close to 1 and the curve steep.
    near = two_level_closed_form([limit * (1.0 - 1e-12), limit * (1.0 + 1e-12)], ratio, eps)
    at_limit = 1.0 - eps * limit / ratio
    assert lasso_boundary(limit * (1.0 - 1e-12), ratio, eps) == near[0]
    assert near == pytest.approx([at_limit, at_limit], abs=1e-4)


@pytest.mark.parametrize(("ratio", "eps"), [(0.1, 0.1), (0.3, 0.2), (0.5, 0.5), (0.9, 0.97)])
@pytest.mark.parametrize("beyond", [0.1, 0.5, 0.9])
def test_a_two_level_shrinkage_reaches_it(ratio, eps, beyond):
    """Levels a, the threshold of the transition, and b, the null share's; h tending to 0.

    With effects that outgrow tau at the share eps*/eps, and others that tend to 0: the risk and
    E eta' tend to the ratio, at a speed of h.
    """
    limit = power_limit(ratio, eps)
    u = limit + beyond * (1.0 - limit)
    fdp = two_level_closed_form(u, ratio, eps)
    a = float(threshold_at_ratio(np.array(ratio)))
    b = float(-ndtri(0.5 * fdp * eps * u / ((1.0 - fdp) * (1.0 - eps))))
    assert b < a
    big = critical_sparsity(ratio)
    h = 1e-6
    risk, slope = risk_and_slope(np.array([0.0, 60.0]), *(np.array(v) for v in (b, a - b, h)))
    shares = np.array([1.0 - big, big])
    assert shares @ risk == pytest.approx(ratio, abs=10.0 * h)
    assert shares @ slope == pytest.approx(ratio, abs=10.0 * h)
    chance = float(selected(np.array(0.0), np.array(b)))
    assert (big + (eps - big) * chance) / eps == pytest.approx(u, abs=1e-9)


@pytest.mark.parametrize("ratio", [0.2, 0.7, 1.0, 4.0])
def test_without_a_power_limit_it_is_the_lasso(ratio):
    eps = 0.5 * critical_sparsity(ratio) if ratio < 1.0 else 0.5
    u = np.linspace(0.01, 1.0, 50)
    assert np.array_equal(two_level_closed_form(u, ratio, eps), lasso_boundary(u, ratio, eps))
