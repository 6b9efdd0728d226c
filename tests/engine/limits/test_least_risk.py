import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.limits import least_risk as module
from engine.limits.least_risk import least_risk
from engine.limits.polar import risk_at
from engine.normal import density, selection

# (threshold, sizes, masses): dense and sparse, one atom and two, pooled and not.
LAWS = [
    (0.687, (1.4745,), (0.2,)),
    (1.2, (0.9, 3.0), (0.1, 0.05)),
    (0.3, (0.2,), (0.7,)),
    (2.2, (4.9,), (0.0073,)),
    (0.05, (2.5,), (0.9,)),
    (3.0, (1.0, 9.0), (0.02, 0.001)),
]


def risk_by_quadrature(shrinkage, sizes, masses):
    """E (eta(pi + Z) - pi)^2 atom by atom on both sides of 0, eta between nodes by a line."""
    x = np.linspace(-20.0, 20.0, 400_000)
    withheld = np.interp(np.abs(x), shrinkage.x, shrinkage.withheld)
    eta = np.where(np.abs(x) > shrinkage.threshold, np.sign(x) * (np.abs(x) - withheld), 0.0)
    atoms = [(0.0, 1.0 - sum(masses)), *zip(sizes, masses, strict=True)]
    return sum(p * np.sum((eta - t) ** 2 * density(x - t)) * (x[1] - x[0]) for t, p in atoms)


@pytest.mark.parametrize(("threshold", "sizes", "masses"), LAWS)
class TestShrinkage:
    def test_risk_is_that_of_the_shrinkage(self, threshold, sizes, masses):
        best = least_risk(threshold, sizes, masses)
        # The error is that of a line between nodes that lie 1/80 apart, at the kinks of eta.
        assert risk_by_quadrature(best, sizes, masses) == pytest.approx(best.risk, rel=2e-5)

    def test_slope_is_between_zero_and_one(self, threshold, sizes, masses):
        best = least_risk(threshold, sizes, masses)
        rise = np.diff(best.x - best.withheld) / np.diff(best.x)
        # Where the density is below 1e-9 the regression rests on rounding only.
        carried = best.mass[1:] > 1e-9
        assert rise[carried].min() >= -1e-6
        assert rise[carried].max() <= 1.0 + 1e-9
        assert best.withheld[0] == best.x[0] == threshold  # no jump there

    def test_mean_slope_by_stein_is_that_by_differences(self, threshold, sizes, masses):
        best = least_risk(threshold, sizes, masses)
        middle = 0.5 * (best.x[1:] + best.x[:-1])
        w = 2.0 * (1.0 - sum(masses)) * density(middle)
        for t, p in zip(sizes, masses, strict=True):
            w += p * (density(middle - t) + density(middle + t))
        by_differences = float(w @ np.diff(best.x - best.withheld))
        # The midpoint rule at steps of 1/80, to first order at the kinks.
        assert best.slope == pytest.approx(by_differences, abs=1e-4)

    def test_no_other_admissible_shrinkage_does_better(self, threshold, sizes, masses):
        best = least_risk(threshold, sizes, masses)
        x, mass = best.x, best.mass
        rng = np.random.default_rng(0)
        mean = posterior_mean(x, sizes, masses)
        energy = best.energy

        def risk(withheld):
            return energy + mass @ ((withheld - x + mean) ** 2 - mean**2)

        assert risk(best.withheld) == pytest.approx(best.risk, rel=1e-12)
        for _ in range(50):
            other = threshold + np.cumsum(rng.exponential(size=x.size) * rng.random() * 0.02)
            mix = best.withheld + rng.random() * (other - best.withheld)
            assert risk(mix) >= best.risk * (1.0 - 1e-12)

    def test_half_the_step_changes_little(self, threshold, sizes, masses, monkeypatch):
        risk = least_risk(threshold, sizes, masses).risk
        monkeypatch.setattr(module, "_STEP", 0.5 * module._STEP)
        module._evenly.cache_clear()
        finer = least_risk(threshold, sizes, masses).risk
        module._evenly.cache_clear()
        # The accuracy that the module states, with a margin for single kinks.
        assert risk == pytest.approx(finer, rel=7e-7, abs=1.5e-7)


def posterior_mean(x, sizes, masses):
    top, bottom = 0.0, 2.0 * (1.0 - sum(masses)) * density(x) + 1e-250
    for t, p in zip(sizes, masses, strict=True):
        top = top + p * t * (density(x - t) - density(x + t))
        bottom = bottom + p * (density(x - t) + density(x + t))
    return top / bottom


def test_effects_of_size_zero_cost_nothing():
    best = least_risk(0.4, (0.0,), (0.3,))
    # Everything is shrunk to 0+: A = x. The floor under the weights is all that is left.
    assert best.risk == pytest.approx(0.0, abs=1e-12)
    assert best.slope == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize(("threshold", "share"), [(1.44, 0.0824), (0.67, 0.3), (2.5, 0.01)])
def test_a_large_effect_tends_to_the_polar_law(threshold, share):
    # The level is the threshold here: it is above the stationary c of the polar law.
    polar = risk_at(np.array(threshold), np.array(share))
    assert least_risk(threshold, (threshold + 13.0,), (share,)).risk == pytest.approx(
        polar, rel=1e-7
    )


@settings(max_examples=60, deadline=None)
@given(
    threshold=st.floats(0.0, 4.0),
    rise=st.floats(0.01, 1.0),
    size=st.floats(0.0, 8.0),
    other=st.floats(0.0, 8.0),
    mass=st.floats(0.001, 0.97),
    weight=st.floats(0.05, 0.95),
)
def test_rises_with_the_threshold_and_is_concave_in_the_law(
    threshold, rise, size, other, mass, weight
):
    risk = least_risk(threshold, (size,), (mass,)).risk
    noise = 1e-6 * (1.0 + size**2)  # of the quadrature, relative to E pi^2
    assert least_risk(threshold + rise, (size,), (mass,)).risk >= risk - noise
    mixed = least_risk(threshold, (size, other), (mass * weight, mass * (1.0 - weight))).risk
    apart = weight * risk + (1.0 - weight) * least_risk(threshold, (other,), (mass,)).risk
    assert mixed >= apart - 1e-6 * (1.0 + max(size, other) ** 2)


def test_masses_add_up_to_the_share_past_the_threshold():
    best = least_risk(0.8, (1.7,), (0.25,))
    past = 0.75 * selection(np.array(0.0), np.array(0.8)) + 0.25 * selection(
        np.array(1.7), np.array(0.8)
    )
    assert best.mass.sum() == pytest.approx(past, rel=1e-8)
