"""State evolution: fixed points, their order, and the strengths that have no fit."""

import numpy as np
import pytest

from engine.evolution import settle, settle_all
from engine.penalties.designed import Designed
from engine.penalties.lasso import Lasso
from engine.penalties.ramp import Ramp, TunedRamp
from engine.penalties.two_level import TunedTwoLevel, TwoLevel
from engine.penalties.weights import Weights
from engine.signal import signal_law
from engine.study import Effect, Study

DENSE = signal_law(Study("", 600, 2000, 400, 1.0, (Effect(0.25, 1.0),)))
MIXED = signal_law(Study("", 900, 1500, 200, 2.0, (Effect(0.2, 0.5), Effect(0.5, 0.5))))


@pytest.mark.parametrize("law", [DENSE, MIXED])
@pytest.mark.parametrize(
    "penalty",
    [Lasso(), Designed(), Ramp(0.3), TunedRamp(), TwoLevel(2.0, 1.0, 0.1), Weights((3.0, 1.0))],
)
def test_the_effective_noise_solves_its_equation(law, penalty):
    states = [state for state in settle_all(law, penalty, np.linspace(0.8, 2.5, 6)) if state]
    assert states  # two levels leave out what their path jumps over
    for state in states:
        again = law.noise**2 + state.tau**2 * state.shape.risk / law.delta
        assert state.tau**2 == pytest.approx(again, rel=1e-6)
        assert state.calibration >= 0.0


@pytest.mark.parametrize("law", [DENSE, MIXED])
@pytest.mark.parametrize("threshold", [1.4, 1.8, 2.4])
def test_designed_is_never_worse_at_the_same_zero_threshold(law, threshold):
    best = settle(law, Designed(), threshold)
    others = [
        Lasso(),
        Ramp(0.2),
        TunedRamp(),
        TwoLevel(2.0, 1.0, 0.1),
        TunedTwoLevel(law.delta),
    ]
    for penalty in others:
        state = settle(law, penalty, threshold)
        if state is not None:
            assert best.tau <= state.tau * (1.0 + 1e-5)  # quadrature on the nodes


@pytest.mark.parametrize(
    "equal", [TwoLevel(1.5, 1.5, 0.4), Weights((2.0,)), Weights((0.7, 0.7, 0.7))]
)
def test_equal_weights_of_any_family_give_the_lasso(equal):
    for threshold in (1.4, 2.0):
        lasso, same = (settle(MIXED, penalty, threshold) for penalty in (Lasso(), equal))
        assert same.tau == pytest.approx(lasso.tau, rel=1e-6)
        assert same.tpp == pytest.approx(lasso.tpp, abs=1e-6)
        assert same.calibration == pytest.approx(lasso.calibration, abs=1e-5)


def test_tuned_two_level_is_the_best_of_many_stated_ones():
    threshold = 1.3
    best = settle(DENSE, TunedTwoLevel(DENSE.delta), threshold).tau
    for ratio in (1.2, 1.8, 2.6):
        for share in (0.005, 0.02, 0.05, 0.1, 0.3):
            state = settle(DENSE, TwoLevel(ratio, 1.0, share), threshold)
            assert state is None or state.tau >= best - 1e-6


def test_a_strength_too_small_has_no_fit():
    assert settle(DENSE, Lasso(), 0.3) is None  # more than all runs are used up
    assert settle(DENSE, Designed(), 0.3) is not None
