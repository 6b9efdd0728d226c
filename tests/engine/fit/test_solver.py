"""The solver: fits are certified, zeros and ties exact, and paths are the single fits."""

import numpy as np
import pytest

from engine.fit.certificate import least_empty_scale, unsettled
from engine.fit.prox import clusters, prox
from engine.fit.solver import Solver
from tests.bench.fista import fista, relative_gap
from tests.engine.fit.problems import DESIGNS, WEIGHTS, design, study, weights_of

GAP = 1e-9


def steps_down(X, y, weights, low=0.05, count=6):
    """Weights at scales from just below the emptying one down."""
    top = least_empty_scale(X.T @ y, weights)
    return [scale * weights for scale in top * np.geomspace(0.9, low, count)]


@pytest.mark.parametrize("kind", WEIGHTS)
@pytest.mark.parametrize("columns", DESIGNS)
@pytest.mark.parametrize("ratio", [0.1, 0.5, 1.5])
def test_every_fit_of_a_path_is_certified_and_settled(kind, columns, ratio):
    X, y = study(int(160 * ratio), 160, kind=columns)
    solver = Solver(X, y)
    for weights in steps_down(X, y, weights_of(kind, 160)):
        found = solver.solve(weights, GAP)
        assert found.certified
        # The gap from the definition, by other code; both are rounded in units of 1e-16.
        assert 0.0 <= found.gap <= GAP
        assert relative_gap(X, y, found.b, weights) == pytest.approx(found.gap, abs=1e-13)
        # *Common practice, no source*: at most as many magnitudes as runs. That is where the
        # columns are in general position; among 160 columns of 16 small counts some coincide.
        if ratio > 0.1 or columns not in ("rademacher", "counts"):
            assert found.undecided.size == 0
            assert clusters(found.b).starts.size <= X.shape[0]
        else:
            many = clusters(found.b).starts.size > X.shape[0]
            assert not many or found.undecided.size > 0


@pytest.mark.parametrize("kind", WEIGHTS)
def test_the_textbook_method_agrees(kind):
    X, y = study(60, 120)
    weights = steps_down(X, y, weights_of(kind, 120))[3]
    found = Solver(X, y).solve(weights, 1e-12)
    # Both objectives are within 1e-12 ||y||^2 / 2 of the least one, and restricted to the
    # support the objective is strongly convex, with a modulus of about .1 here: coefficients
    # differ by some sqrt(2 * 1e-12 * ||y||^2 / .1) < 3e-4; they agree far better.
    assert found.b == pytest.approx(fista(X, y, weights, 1e-12), abs=1e-4)
    assert found.b == pytest.approx(prox(found.b + found.g, weights), abs=1e-4)


@pytest.mark.parametrize("kind", WEIGHTS)
def test_a_path_in_any_order_gives_the_single_fits(kind):
    X, y = study(80, 160)
    every = steps_down(X, y, weights_of(kind, 160))
    solver = Solver(X, y)
    for weights in [*every, every[1], every[4]]:
        along, alone = solver.solve(weights, GAP), Solver(X, y).solve(weights, GAP)
        assert (along.b == 0.0).tolist() == (alone.b == 0.0).tolist()
        assert along.b == pytest.approx(alone.b, abs=1e-4)  # as above, at a gap of 1e-9


def test_the_equations_of_the_optimum_hold():
    """Equal weights: X'r is the weight times the sign where nonzero, and smaller elsewhere."""
    X, y = study(80, 160)
    weights = steps_down(X, y, weights_of("lasso", 160))[3]
    found = Solver(X, y).solve(weights, 1e-13)
    on = found.b != 0.0
    assert found.g[on] == pytest.approx(weights[0] * np.sign(found.b[on]), abs=1e-5)
    assert (np.abs(found.g[~on]) < weights[0]).all()
    assert on.sum() <= 80


def test_nearly_equal_weights_are_nearly_the_lasso():
    """The branch for equal weights and the sorted one meet."""
    X, y = study(80, 160)
    weights = steps_down(X, y, weights_of("lasso", 160))[3]
    nearly = weights.copy()
    nearly[-1] *= 1.0 - 1e-13
    equal, sorted_ = Solver(X, y).solve(weights, GAP), Solver(X, y).solve(nearly, GAP)
    assert (equal.b != 0.0).tolist() == (sorted_.b != 0.0).tolist()
    assert equal.b == pytest.approx(sorted_.b, abs=1e-4)


def test_more_may_be_selected_than_there_are_runs():
    X, y = study(20, 200)
    weights = steps_down(X, y, weights_of("ramp", 200))[-1]
    found = Solver(X, y).solve(weights, GAP)
    assert np.count_nonzero(found.b) > 20
    assert clusters(found.b).starts.size <= 20


def test_from_the_emptying_scale_on_nothing_is_selected():
    X, y = study(40, 80)
    weights = weights_of("ramp", 80)
    top = least_empty_scale(X.T @ y, weights)
    empty = Solver(X, y).solve(1.0001 * top * weights, GAP)
    assert not empty.b.any()
    assert empty.certified
    assert Solver(X, y).solve(0.999 * top * weights, GAP).b.any()


def test_a_response_of_zeros():
    X, _ = study(40, 80)
    found = Solver(X, np.zeros(40)).solve(np.ones(80), GAP)
    assert not found.b.any()
    assert (found.gap, found.certified, found.undecided.size) == (0.0, True, 0)


def test_columns_of_zeros_are_never_selected():
    X, y = study(40, 80)
    X[:, [3, 50]] = 0.0
    found = Solver(X, y).solve(steps_down(X, y, weights_of("two-level", 80))[-1], GAP)
    assert found.certified
    assert not found.b[[3, 50]].any()


def test_weights_that_end_in_zeros():
    X, y = study(40, 80)
    weights = np.concatenate([np.full(40, 1.0), np.zeros(40)])
    found = Solver(X, y).solve(weights, 1e-6)
    assert found.certified
    assert relative_gap(X, y, found.b, weights) <= 1e-6 + 1e-12


def test_an_unsettled_zero_is_named():
    """At a point short of the optimum the proximal steps disagree with its zeros."""
    X, y = study(40, 80)
    weights = steps_down(X, y, weights_of("lasso", 80))[2]
    found = Solver(X, y).solve(weights, GAP)
    nearly = found.b.copy()
    dropped = np.flatnonzero(nearly)[0]
    nearly[dropped] = 0.0
    assert dropped in unsettled(nearly, X.T @ (y - X @ nearly), weights)


def test_two_copies_of_a_column_cannot_be_told_apart():
    """Which copy the lasso selects is not settled; the objective is certified all the same."""
    rng = np.random.default_rng(3)
    X = np.repeat(design("gaussian", 40, 30, rng), 2, axis=1)
    y = X[:, :6] @ np.full(6, 3.0) + rng.normal(size=40)
    found = Solver(X, y).solve(np.full(60, 1.0), GAP)
    assert found.certified
    assert found.b.reshape(30, 2).sum(axis=1).any()
