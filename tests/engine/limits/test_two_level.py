"""Exact two-level: its witness attains it, and its weights make the two-level shrinkage."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq, isotonic_regression
from scipy.stats import norm

from engine import sorted_l1_boundary, two_level_boundary, two_level_closed_form
from engine.limits.two_level_moments import Pieces, risk_and_slope
from engine.limits.two_level_witness import two_level_witness
from tests.engine.limits.test_two_level_moments import by_quadrature, eta


@settings(max_examples=60, deadline=None)
@given(st.floats(0.02, 0.99), st.floats(-4.6, 1.5), st.floats(-7.0, -0.05))
def test_the_witness_attains_the_boundary(u, log_ratio, log_eps):
    delta, eps = float(np.exp(log_ratio)), float(np.exp(log_eps))
    found = two_level_witness(u, delta, eps)
    assert found.fdp == two_level_boundary(u, delta, eps)
    # The search meets the ratio to 1e-8 of itself; a threshold of an FDP near 0 only to 1e-6.
    assert found.risk <= delta * (1.0 + 1e-6)
    assert found.slope <= delta * (1.0 + 1e-6)
    assert sum(found.law.shares) == pytest.approx(1.0)
    sizes = np.array(found.law.sizes)
    chance = norm.sf(found.zero_threshold - sizes) + norm.cdf(-found.zero_threshold - sizes)
    assert np.dot(found.law.shares, chance) == pytest.approx(u, abs=1e-9)
    assert found.levels[0] >= found.levels[1] >= 0.0
    weights = found.normalised_weights(500)
    assert np.all(np.diff(weights) <= 0.0)


@pytest.mark.parametrize(
    ("u", "delta", "eps"),
    [
        (0.8, 0.3, 0.2), (0.9944, 0.6, 0.3), (0.7717, 0.0476, 0.0104),  # searched
        (0.4, 0.3, 0.2), (0.9, 1.1, 0.5), (0.2, 2.0, 0.5),  # polar
        (0.7, 0.15, 0.05),  # closed form
    ],
)  # fmt: skip
def test_the_witness_by_quadrature(u, delta, eps):
    """Its levels and its law, put into the definitions: TPP, FDP, risk and E eta'.

    Sizes that outgrow tau are 30 here, and so is the height for the polar law. The search meets
    the ratio to 1e-8, the quadrature the moments to a few 1e-8.
    """
    found = two_level_witness(u, delta, eps)
    b, gap = found.levels[1], found.levels[0] - found.levels[1]
    sizes = [min(size, 30.0) for size in found.law.sizes]
    height = height_of(found)
    null = by_quadrature(0.0, b, gap, height)
    actives = np.array([by_quadrature(size, b, gap, height) for size in sizes])
    risk, slope = (1.0 - eps) * np.array(null) + eps * (found.law.shares @ actives)
    assert risk <= delta + 1e-6
    assert slope <= delta + 1e-6
    assert (risk, slope) == pytest.approx((found.risk, found.slope), abs=1e-6)
    # Nothing better is known to exist, so one of the two conditions is met with equality.
    assert max(risk, slope) == pytest.approx(delta, abs=1e-6)
    false = 2.0 * (1.0 - eps) * norm.sf(b)
    assert false / (false + eps * u) == pytest.approx(found.fdp, abs=1e-8)


def height_of(found):
    """Height of the flat stretch, from the share of the ranks that has the upper level."""
    if found.levels[0] == found.levels[1]:
        return 0.0
    law = found.law

    def excess(h):
        pieces = Pieces(found.levels[1], found.levels[0] - found.levels[1], h)
        return pieces.level_share(law, found.sparsity) - found.level_share

    if excess(0.0) <= 1e-12:  # no stretch is lower: its limit
        return 0.0
    return 30.0 if math.isinf(law.sizes[-1]) else brentq(excess, 0.0, 12.0, xtol=1e-14)


def test_its_weights_make_the_shrinkage():
    """The sorted-L1 prox of a fine population, under these weights, is the two-level eta.

    400,000 quantiles of |pi + Z|: a step of the population moves the ends of the flat stretch
    by its mass over the density there, some 1e-4.
    """
    found = two_level_witness(0.8, 0.3, 0.2)
    (size,) = found.law.sizes
    n = 400_000
    nulls = norm.ppf((np.arange(int(0.8 * n)) + 0.5) / int(0.8 * n))
    actives = size + norm.ppf((np.arange(int(0.2 * n)) + 0.5) / int(0.2 * n))
    x = np.sort(np.abs(np.concatenate([nulls, actives])))
    weights = found.normalised_weights(len(x))[::-1]  # the largest weight to the largest x
    prox = np.maximum(isotonic_regression(x - weights).x, 0.0)
    b, gap = found.levels[1], found.levels[0] - found.levels[1]
    flat = prox[(x > b + gap) & (x < b + gap + 0.05)]
    h = float(np.median(flat))
    assert h > 0.0
    assert prox == pytest.approx(eta(x, b, gap, h), abs=2e-3)
    # The tail of the largest estimates is thin: hence the median height, found on the sample.
    risk, slope = risk_and_slope(np.array([0.0, size]), np.array(b), np.array(gap), np.array(h))
    assert 0.8 * risk[0] + 0.2 * risk[1] == pytest.approx(found.risk, rel=2e-3)
    assert 0.8 * slope[0] + 0.2 * slope[1] == pytest.approx(found.slope, rel=2e-2)


def test_where_the_slope_binds_the_closed_form_is_exact():
    """Just above the power limit of a sparse study the polar law is ruled out by E eta'."""
    exact = two_level_boundary(0.70, 0.15, 0.05)
    assert exact == pytest.approx(two_level_closed_form(0.70, 0.15, 0.05), abs=1e-9)
    assert sorted_l1_boundary(0.70, 0.15, 0.05) < exact - 0.01
