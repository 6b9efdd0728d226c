"""Each closed form against quadrature of its definition (scipy.integrate.quad)."""

from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import norm

from engine import normal

POINTS = [(0.0, 0.0), (0.0, 1.3), (0.7, 0.4), (2.5, 1.0), (1.0, 2.5), (6.0, 3.0), (0.2, 5.0)]


def expectation(f, *kinks: float) -> float:
    """E f(Z), integrated piece by piece; 12 standard deviations leave out 1e-32."""
    ends = [-12.0, *sorted(k for k in kinks if abs(k) < 12.0), 12.0]
    return sum(
        quad(lambda z: f(z) * norm.pdf(z), a, b, epsabs=1e-13)[0] for a, b in pairwise(ends)
    )


def soft(x: float, a: float) -> float:
    return np.sign(x) * max(abs(x) - a, 0.0)


@pytest.mark.parametrize(("m", "a"), POINTS)
def test_soft_risk(m, a):
    expected = expectation(lambda z: (soft(m + z, a) - m) ** 2, a - m, -a - m)
    assert normal.soft_risk(np.array(m), np.array(a)) == pytest.approx(expected, abs=1e-10)


@pytest.mark.parametrize("a", [0.0, 0.5, 1.0, 2.0, 4.0])
def test_null_risk(a):
    expected = expectation(lambda z: soft(z, a) ** 2, a, -a)
    assert normal.null_risk(np.array(a)) == pytest.approx(expected, abs=1e-10)


def test_null_risk_of_a_huge_threshold_is_0_and_never_negative():
    assert np.all(normal.null_risk(np.array([20.0, 1e3, 1e8])) >= 0.0)


@pytest.mark.parametrize(("m", "a"), POINTS)
def test_selection(m, a):
    expected = norm.sf(a - m) + norm.cdf(-a - m)
    assert normal.selection(np.array(m), np.array(a)) == pytest.approx(expected, abs=1e-15)


def test_soft_risk_tends_to_1_plus_a_squared():
    assert normal.soft_risk(np.array(40.0), np.array(2.0)) == pytest.approx(5.0, rel=1e-12)


@pytest.mark.parametrize("x", [0.0, 1e-9, 0.3, 3.0, 30.0])
def test_mills_ratio_tail_density_and_centre(x):
    value = np.array(x)
    expected = np.exp(norm.logsf(x) - norm.logpdf(x))
    assert normal.mills(value) == pytest.approx(expected, rel=1e-11)
    assert normal.tail(value) == pytest.approx(norm.sf(x), rel=1e-13)
    assert normal.density(value) == pytest.approx(norm.pdf(x), rel=1e-13)
    assert normal.central(value) == pytest.approx(2.0 * norm.cdf(x) - 1.0, abs=1e-15)
