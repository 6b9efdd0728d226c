"""The normalised law: scaling by the runs, and the quadrature of spreads."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import expon, halfnorm

from engine.normal import selection
from engine.signal import signal_law
from engine.study import Effect, Spread, Study


def study(effects, runs=600, noise=1.0):
    return Study("", runs, 2000, 100, noise, effects)


def test_more_runs_raise_both_the_ratio_and_the_normalised_effects():
    few, many = (signal_law(study((Effect(0.2, 1.0),), runs)) for runs in (400, 1600))
    assert many.delta == 4.0 * few.delta
    assert many.sizes[0] == pytest.approx(2.0 * few.sizes[0], rel=1e-15)
    assert few.sizes[0] == pytest.approx(4.0, rel=1e-15)  # .2 sqrt(400)


def test_signs_do_not_matter_and_shares_are_of_the_actives():
    law = signal_law(study((Effect(-0.2, 0.25), Effect(0.3, 0.75))))
    assert (law.sizes > 0.0).all()
    assert law.masses == pytest.approx([0.0125, 0.0375])
    assert law.masses.sum() == pytest.approx(law.eps)


@pytest.mark.parametrize("name", ["normal", "exponential"])
@pytest.mark.parametrize("scale", [0.004, 0.05, 0.2, 1.0, 10.0])
@pytest.mark.parametrize("tau", [1.0, 1.7, 6.0])
def test_spreads_give_the_tpp_to_a_millionth(name, scale, tau):
    law = signal_law(study((Spread(name, scale, 1.0),)))
    spread = (halfnorm if name == "normal" else expon)(scale=scale * np.sqrt(600))
    for alpha in (0.3, 1.5, 4.0):
        got = law.masses @ selection(law.sizes / tau, np.array(alpha)) / law.eps

        def integrand(b, alpha=alpha):
            return spread.pdf(b) * float(selection(np.array(b / tau), np.array(alpha)))

        top = 30.0 * spread.std()
        points = [p for p in (alpha * tau, (alpha + 6) * tau) if p < top]
        want = quad(integrand, 0.0, top, points=points, limit=400, epsabs=1e-10)[0]
        assert got == pytest.approx(want, abs=1e-6)
