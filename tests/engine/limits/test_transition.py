"""The transition: its parametric form, the minimax identity, and the drawing aids."""

import math

import numpy as np
import pytest
from scipy.optimize import brentq, minimize_scalar
from scipy.stats import norm

from engine import critical_sparsity, power_limit
from engine.limits.transition import (
    near_threshold_at_ratio,
    near_threshold_at_sparsity,
    threshold_at_ratio,
    threshold_at_sparsity,
)


def parametric(t):
    """Sampling ratio and critical sparsity at t, as published, with scipy.stats.norm."""
    scale = 2.0 * norm.pdf(t) + t * (2.0 * norm.cdf(t) - 1.0)
    ratio = 2.0 * norm.pdf(t) / scale
    return ratio, 2.0 * (norm.pdf(t) - t * norm.sf(t)) / scale


@pytest.mark.parametrize("t", [0.01, 0.3, 0.8, 1.3, 2.0, 3.0, 4.0])
def test_the_parametric_form(t):
    # The plain difference phi - t Phi(-t) keeps 11 digits up to t = 4.
    ratio, sparsity = parametric(t)
    assert threshold_at_ratio(np.array(ratio)) == pytest.approx(t, rel=1e-10)
    assert critical_sparsity(ratio) == pytest.approx(sparsity, rel=1e-10)


@pytest.mark.parametrize("ratio", [0.02, 0.2, 0.5, 0.8, 0.97])
def test_against_plain_root_finding(ratio):
    t = brentq(lambda t: parametric(t)[0] - ratio, 1e-9, 6.0, xtol=1e-14)
    assert critical_sparsity(ratio) == pytest.approx(parametric(t)[1], abs=1e-11)


@pytest.mark.parametrize("eps", [0.001, 0.02, 0.2, 0.5, 0.9])
def test_the_minimax_threshold_has_the_least_risk(eps):
    def risk(t):
        null = 2.0 * ((1.0 + t * t) * norm.sf(t) - t * norm.pdf(t))
        return (1.0 - eps) * null + eps * (1.0 + t * t)

    least = minimize_scalar(risk, bounds=(0.0, 6.0), method="bounded", options={"xatol": 1e-9})
    # A minimum is found to the square root of the rounding only.
    assert threshold_at_sparsity(np.array(eps)) == pytest.approx(least.x, abs=1e-6)
    # On the transition the least risk is the sampling ratio, at the same t.
    assert critical_sparsity(least.fun) == pytest.approx(eps, rel=1e-9)


@pytest.mark.parametrize("share", [1e-200, 1e-12, 1e-3, 0.3, 0.9, 1.0 - 1e-12])
def test_drawing_aids_are_near(share):
    for near, exact in (
        (near_threshold_at_ratio, threshold_at_ratio),
        (near_threshold_at_sparsity, threshold_at_sparsity),
    ):
        # The table they read begins at t = 2e-9: below it they stay there.
        assert near(share) == pytest.approx(float(exact(np.array(share))), rel=1e-3, abs=3e-9)


def test_the_power_limit_leaves_1_at_the_transition():
    eps_star = critical_sparsity(0.4)
    assert power_limit(0.4, 0.999 * eps_star) == 1.0
    assert power_limit(0.4, [eps_star * (1.0 + 1e-9), 0.999999]) == pytest.approx(
        [1.0, 0.4], abs=1e-5
    )  # where everything is active, the share found is that of the runs
    assert np.all(np.diff(power_limit(0.4, np.linspace(eps_star, 0.98, 200))) < 0.0)


def test_the_power_limit_by_its_formula():
    ratio, eps = 0.3, 0.2
    eps_star = critical_sparsity(ratio)
    by_formula = 1.0 - (1.0 - ratio) * (eps - eps_star) / (eps - eps * eps_star)
    assert power_limit(ratio, eps) == pytest.approx(by_formula, abs=1e-14)


def test_messages():
    with pytest.raises(ValueError, match="^sampling_ratio must be a finite number above 0"):
        critical_sparsity(math.nan)
    with pytest.raises(ValueError, match="^sparsity must be .* above 0 and below 1, not 1$"):
        power_limit(0.3, 1)
