import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from engine.limits.least_risk import least_risk
from engine.limits.polar import (
    level_of,
    polar_risk,
    polar_share,
    polar_threshold,
    risk_at,
    saturated,
    saturated_threshold,
)
from engine.normal import tail


def at(*values):
    return tuple(np.array(value) for value in values)


class TestPolarThreshold:
    @pytest.mark.parametrize(
        ("u", "delta", "eps"), [(0.2, 0.3, 0.2), (1.0, 1.2, 0.9), (0.001, 20.0, 0.0005)]
    )
    def test_risk_there_is_the_sampling_ratio(self, u, delta, eps):
        u, delta, eps = at(u, delta, eps)
        b = polar_threshold(u, delta, eps)
        assert polar_risk(b, u, eps) == pytest.approx(delta, rel=1e-9)
        assert polar_risk(b + 1e-4, u, eps) > delta

    def test_share_and_threshold_make_the_tpp(self):
        alpha, u = at(1.3, 0.6)
        share = polar_share(alpha, u)
        assert share + (1.0 - share) * 2.0 * tail(alpha) == pytest.approx(0.6, abs=1e-14)

    def test_nan_where_the_risk_is_too_large(self):
        assert np.isnan(polar_threshold(*at(0.9, 0.05, 0.5)))


class TestSaturated:
    @pytest.mark.parametrize("delta", [1e-8, 0.001, 0.05, 0.3, 0.6, 0.69])
    def test_risk_is_stationary_in_the_level_and_equals_delta(self, delta):
        c, x = saturated(np.array(delta))
        assert risk_at(c, x) == pytest.approx(delta, rel=1e-12)
        least = minimize_scalar(
            lambda b: float(risk_at(np.array(b), x)), bounds=(0.0, 9.0), method="bounded"
        )
        # A minimiser is found to the square root of the rounding of the values only.
        assert least.x == pytest.approx(c, abs=1e-4)
        assert least.fun >= delta * (1.0 - 1e-9)

    @pytest.mark.parametrize(
        ("u", "delta", "eps"), [(0.92389, 0.021166, 0.002871), (0.88704, 0.01365, 0.0017548)]
    )
    def test_regression_meets_it_at_large_sizes(self, u, delta, eps):
        alpha = float(saturated_threshold(*at(u, delta, eps)))
        share = float(polar_share(*at(alpha, u)))
        # 13 standard deviations past the threshold stand for infinity.
        risk = least_risk(alpha, (alpha + 13.0,), (eps * share,)).risk
        assert risk == pytest.approx(delta, rel=1e-6)
        level = level_of(*at(alpha, eps * share, delta))
        assert level == pytest.approx(float(saturated(np.array(delta))[0]), rel=1e-12)
        assert level > alpha

    def test_none_from_the_largest_stationary_risk_on(self):
        u, delta, eps = at([0.3, 0.6, 0.99], 0.7, 0.9)
        assert np.isnan(saturated_threshold(u, delta, eps)).all()

    def test_level_is_the_threshold_where_the_risk_is_met_there(self):
        u, delta, eps = at(1.0, 0.6, 0.9)
        b = polar_threshold(u, delta, eps)
        assert level_of(b, eps, delta) == b
