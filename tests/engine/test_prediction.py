"""Predictions: targets met, scalings, order of families and rules, honest nones, messages."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import predict
from engine.evolution import tpp_of
from engine.prediction import (
    SELECTIONS,
    curve,
    marginal_screening,
    prediction_optimal_lasso,
)
from engine.signal import signal_law
from engine.study import Effect, Spread, Study

DENSE = Study("", 600, 2000, 400, 1.0, (Effect(0.25, 1.0),))
MIXED = Study("", 900, 1500, 200, 2.0, (Effect(-0.2, 0.5), Spread("normal", 0.3, 0.5)))
TUNED = ("lasso", "two-level", "ramp", "designed")


@st.composite
def studies(draw):
    candidates = draw(st.integers(400, 4000))
    runs = round(candidates * draw(st.floats(0.2, 1.5)))
    actives = round(candidates * draw(st.floats(0.02, 0.3)))
    sizes = [draw(st.floats(1.0, 8.0)) / math.sqrt(runs) for _ in range(2)]
    share = draw(st.floats(0.1, 0.9))
    effects = (Effect(sizes[0], share), Effect(sizes[1], 1.0 - share))
    return Study("", runs, candidates, actives, 1.0, effects)


@pytest.mark.parametrize("study", [DENSE, MIXED])
@pytest.mark.parametrize("penalty", TUNED)
@pytest.mark.parametrize("selection", ["nonzero", "two-stage"])
def test_targets_are_met_exactly(study, penalty, selection):
    at_fdp = predict(study, penalty, selection, fdp=0.4)
    assert at_fdp.fdp == pytest.approx(0.4, abs=1e-6)
    back = predict(study, penalty, selection, tpp=at_fdp.tpp)
    assert back.tpp == pytest.approx(at_fdp.tpp, abs=1e-6)
    assert back.fdp <= 0.4 + 1e-5


@pytest.mark.parametrize("penalty", TUNED)
def test_what_is_reported_hangs_together(penalty):
    got = predict(MIXED, penalty, fdp=0.3)
    assert got.true_entries == pytest.approx(200 * got.tpp)
    assert got.false_entries == pytest.approx(got.fdp * got.list_size)
    assert got.lam_per_run == pytest.approx(got.lam / 30.0)
    assert got.lam_unit_variance == pytest.approx(got.lam * 30.0)
    assert got.mse == pytest.approx(0.6 * (got.tau**2 - 4.0))
    assert np.mean([found.tpp for found in got.by_effect]) == pytest.approx(got.tpp)
    assert got.tpp_sd == pytest.approx(math.sqrt(got.tpp * (1.0 - got.tpp) / 200))
    weights = got.weights()
    assert weights.shape == (1500,)
    assert weights[0] == pytest.approx(got.lam)
    assert (np.diff(weights) <= 0.0).all()


@settings(max_examples=6, deadline=None, derandomize=True)
@given(studies())
def test_designed_gives_the_largest_tpp_at_an_fdp(study):
    best = predict(study, "designed", fdp=0.3).tpp
    for penalty in ("lasso", "two-level", "ramp"):
        other = predict(study, penalty, fdp=0.3).tpp
        assert math.isnan(other) or other <= best + 1e-5  # quadrature on the nodes


@settings(max_examples=6, deadline=None, derandomize=True)
@given(studies())
def test_a_second_stage_is_never_worse_than_the_path(study):
    for penalty in ("lasso", "designed"):
        path = predict(study, penalty, fdp=0.3)
        if not path.reason:
            staged = predict(study, penalty, "two-stage", fdp=0.3)
            assert staged.tpp >= path.tpp - 1e-7
            # At the cut of the path point, too: the smaller tau finds more.
            at_same = tpp_of(signal_law(study), staged.tau, path.zero_threshold)
            assert at_same >= path.tpp - 1e-7


def test_equal_weights_of_any_family_are_the_lasso():
    want = predict(DENSE, "lasso", fdp=0.5)
    for got in (
        predict(DENSE, "weights", fdp=0.5, weights=[2.0]),
        predict(DENSE, "two-level", fdp=0.5, levels=(1.0, 1.0), share=0.3),
    ):
        assert (got.tpp, got.tau, got.lam) == pytest.approx(
            (want.tpp, want.tau, want.lam), rel=1e-5
        )


def test_a_strength_is_met_and_gives_its_point_back():
    for penalty in ("lasso", "designed"):
        point = predict(DENSE, penalty, fdp=0.5)
        again = predict(DENSE, penalty, lam=point.lam)
        assert again.fdp == pytest.approx(0.5, abs=1e-6)


def test_the_procedure_of_benjamini_and_hochberg():
    got = predict(DENSE, "lasso", "two-stage-bh", fdp=0.5)
    assert got.fdp == pytest.approx(0.5 * 0.8)
    # The cut solves 2 Phi(-c) = q P(|z| > c).
    listed = got.list_size / 2000
    assert math.erfc(got.cut / math.sqrt(2.0)) == pytest.approx(0.5 * listed)


def test_no_fit_and_out_of_reach_are_said_in_words():
    for got, words in (
        (predict(DENSE, "lasso", tpp=0.9), "TPP 0.9 is outside"),
        (predict(DENSE, "lasso", fdp=0.9), "FDP 0.9 is outside"),
        (predict(DENSE, "lasso", "two-stage", fdp=0.9), "listing every candidate"),
        (predict(DENSE, "lasso", lam=1e6), "lambda 1e+06 is outside"),
    ):
        assert words in got.reason
        assert math.isnan(got.tpp)
        assert math.isnan(got.lam)
        assert got.weights().size == 0


def test_a_jump_is_said_to_be_one():
    got = predict(DENSE, "two-level", fdp=0.5, levels=(2.0, 1.0), share=0.1)
    assert "inside a jump" in got.reason


@pytest.mark.parametrize("penalty", TUNED)
def test_curves_pass_through_the_predictions(penalty):
    path = curve(DENSE, penalty, points=30)
    assert path.tpp.size > 20
    point = predict(DENSE, penalty, fdp=float(path.fdp[15]))
    assert point.tpp == pytest.approx(path.tpp[15], abs=1e-5)
    # The levels of two-level are found to a few hundredths: its risk is flat around them.
    assert point.lam == pytest.approx(path.lam[15], rel=3e-2)


def test_curves_of_cuts():
    path = curve(DENSE, "lasso", "two-stage", points=20)
    assert path.fdp[0] == pytest.approx(0.8)  # every candidate listed
    assert path.tpp[0] == 1.0
    assert (np.diff(path.tpp) < 0.0).all()
    assert (np.diff(path.fdp) < 0.0).all()


def test_comparators():
    screened = marginal_screening(DENSE, fdp=0.5)
    # tau^2 = 1 + .2 (.25 sqrt(600))^2 / .3
    assert screened.tau == pytest.approx(math.sqrt(1.0 + 0.2 * 0.0625 * 600 / 0.3))
    assert math.isnan(screened.lam)
    best = prediction_optimal_lasso(DENSE)
    assert best.tau <= curve(DENSE, "lasso").tau.min() + 1e-7
    assert best.tau == predict(DENSE, "lasso", "two-stage", fdp=0.5).tau


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"penalty": "ridge", "fdp": 0.3}, "penalty must be one of lasso"),
        ({"selection": "all", "fdp": 0.3}, f"selection must be one of {', '.join(SELECTIONS)}"),
        ({"fdp": 0.3, "tpp": 0.3}, "one of fdp, tpp and lam must be given, not 2"),
        ({"selection": "two-stage", "lam": 1.0}, "one of fdp and tpp must be given, not 0"),
        ({"fdp": True}, "fdp must be a finite number above 0 and below 1, not True"),
        ({"lam": 0.0}, "lam must be a finite number above 0, not 0"),
        ({"fdp": 0.3, "weights": [1.0]}, "weights must be left out for lasso"),
        ({"penalty": "weights", "fdp": 0.3, "weights": [1, 2]}, "weights[1] must be at most"),
        ({"penalty": "two-level", "fdp": 0.3, "levels": (2, 1)}, "share must be given"),
        ({"penalty": "ramp", "fdp": 0.3, "ramp_level": 1.0}, "ramp_level must be"),
    ],
)
def test_what_is_wrong_is_named(arguments, words):
    with pytest.raises(ValueError) as error:  # noqa: PT011
        predict(DENSE, **{"penalty": "lasso", **arguments})
    assert words in str(error.value)
