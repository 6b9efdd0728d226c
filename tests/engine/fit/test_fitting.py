"""Fits as a user asks for them: scalings, intercept, paths, odd units, refusals."""

import dataclasses
import re

import numpy as np
import pytest

from engine.fit import fit, path
from tests.bench.fista import relative_gap
from tests.engine.fit.problems import study, weights_of

# Two fits certified at the default gap differ by far less than this in every coefficient (see
# test_solver); sizes here are about 1.
CLOSE = 1e-6


@pytest.fixture(scope="module")
def data():
    """A design whose columns have lengths and means of their own."""
    X, y = study(50, 80)
    rng = np.random.default_rng(5)
    return X * rng.uniform(1.0, 5.0, 80) + rng.normal(size=80), y + 7.0


WEIGHTS = 2.0 * weights_of("ramp", 80)


class TestScalings:
    @pytest.mark.parametrize("columns", ["unit-length", "unit-variance", "as-given"])
    @pytest.mark.parametrize("loss", ["sum", "mean"])
    @pytest.mark.parametrize("intercept", [True, False])
    def test_the_objective_is_the_one_described(self, data, columns, loss, intercept):
        """Scaled by the words of the docstring, the coefficients leave the gap that is told."""
        X, y = data
        if intercept:
            X, y = X - X.mean(axis=0), y - y.mean()
        length = np.linalg.norm(X, axis=0)
        X = {
            "unit-length": X / length,
            "unit-variance": X / length * np.sqrt(50),
            "as-given": X,
        }[columns]
        n = 50 if loss == "mean" else 1
        largest = np.abs(X.T @ y).max() / n
        found = fit(
            *data, 0.3 * largest * WEIGHTS, columns=columns, loss=loss, intercept=intercept
        )
        # The mean loss and its weights are a 50th of the sum and 50 times the weights.
        gap = relative_gap(X, y, found.coefficients, n * 0.3 * largest * WEIGHTS)
        assert gap <= 1e-9 + 1e-13
        assert gap == pytest.approx(found.gap, abs=1e-13)
        assert found.certified
        assert found.support.size > 1

    def test_one_study_in_every_scaling(self, data):
        """Unit-length weights: times sqrt(n) for unit variance, over sqrt(n) for the mean."""
        X, y = data
        root = np.sqrt(50)
        length = fit(X, y, WEIGHTS)
        variance = fit(X, y, root * WEIGHTS, columns="unit-variance")
        mean = fit(X, y, WEIGHTS / root, columns="unit-variance", loss="mean")
        for other in (variance, mean):
            assert other.coefficients * root == pytest.approx(length.coefficients, abs=CLOSE)
            assert other.slopes == pytest.approx(length.slopes, abs=CLOSE)
            assert other.intercept == pytest.approx(length.intercept, abs=1e-4)
            assert other.estimates == pytest.approx(length.estimates, abs=CLOSE)
            assert other.correlations == pytest.approx(length.correlations, abs=CLOSE)

    def test_slopes_and_intercept_predict(self, data):
        X, y = data
        found = fit(X, y, WEIGHTS)
        residuals = y - X @ found.slopes - found.intercept
        assert residuals.mean() == pytest.approx(0.0, abs=1e-10)
        assert np.linalg.norm(residuals) == pytest.approx(found.residual_norm, abs=1e-8)
        centred = X - X.mean(axis=0)
        unit = centred / np.linalg.norm(centred, axis=0)
        assert unit.T @ residuals == pytest.approx(found.correlations, abs=1e-8)

    def test_as_given_tells_debias_about_unit_length(self, data):
        X, y = data
        found = fit(X, y, 5.0, columns="as-given")
        centred = X - X.mean(axis=0)
        lengths = np.linalg.norm(centred, axis=0)
        assert found.coefficients.tolist() == found.slopes.tolist()
        assert found.estimates == pytest.approx(found.slopes * lengths, abs=1e-10)
        residuals = y - X @ found.slopes - found.intercept
        assert found.correlations == pytest.approx(centred.T @ residuals / lengths, abs=1e-8)

    def test_without_intercept_there_is_none(self, data):
        found = fit(*data, WEIGHTS, intercept=False)
        assert found.intercept == 0.0
        assert (found.runs, fit(*data, WEIGHTS).runs) == (50, 49)

    @pytest.mark.parametrize("unit", [1e-300, 1e-160, 1e160, 1e300])
    def test_units_of_any_size(self, data, unit):
        """Squares of such numbers over- or underflow."""
        X, y = data
        plain, response = fit(X, y, WEIGHTS), fit(X, unit * y, unit * WEIGHTS)
        design = fit(unit * X, y, WEIGHTS)
        assert response.coefficients / unit == pytest.approx(plain.coefficients, abs=CLOSE)
        assert design.coefficients == pytest.approx(plain.coefficients, abs=CLOSE)

    def test_a_shift_changes_only_the_intercept(self, data):
        X, y = data
        plain, shifted = fit(X, y, WEIGHTS), fit(X + 3.0, y - 2.0, WEIGHTS)
        assert shifted.coefficients == pytest.approx(plain.coefficients, abs=CLOSE)
        expected = plain.intercept - 2.0 - 3.0 * plain.slopes.sum()
        assert shifted.intercept == pytest.approx(expected, abs=1e-4)


class TestResults:
    def test_support_and_clusters_are_those_of_the_coefficients(self, data):
        found = fit(*data, 0.5 * WEIGHTS)
        sizes = np.abs(found.coefficients)
        assert found.support.tolist() == np.flatnonzero(sizes).tolist()
        distinct = np.unique(sizes[sizes > 0.0])[::-1]
        for rank, size in enumerate(distinct, start=1):
            assert (found.clusters == rank).tolist() == (sizes == size).tolist()
        assert (found.clusters == 0).tolist() == (sizes == 0.0).tolist()
        assert found.clusters.max() == distinct.size < found.support.size  # there are ties

    def test_results_are_frozen(self, data):
        with pytest.raises(dataclasses.FrozenInstanceError):
            fit(*data, WEIGHTS).gap = 0.0

    def test_one_number_is_the_lasso(self, data):
        one, many = fit(*data, 1.5), fit(*data, np.full(80, 1.5))
        assert one.coefficients.tolist() == many.coefficients.tolist()
        assert one.clusters.max() == one.support.size

    def test_a_path_equals_single_fits_in_its_own_order(self, data):
        scales = [0.3, 1.0, 0.5]
        for scale, found in zip(scales, path(*data, WEIGHTS, scales), strict=True):
            alone = fit(*data, scale * WEIGHTS)
            assert found.support.tolist() == alone.support.tolist()
            assert found.coefficients == pytest.approx(alone.coefficients, abs=1e-4)

    def test_an_empty_path(self, data):
        assert path(*data, WEIGHTS, np.array([])) == ()

    def test_a_constant_response_selects_nothing(self, data):
        found = fit(data[0], np.full(50, 0.1), WEIGHTS)
        assert found.support.size == 0
        assert found.intercept == pytest.approx(0.1)

    def test_one_run_and_one_candidate(self):
        found = fit([[2.0]], [3.0], 1.0, intercept=False)
        assert found.coefficients.tolist() == [2.0]
        assert found.slopes.tolist() == [1.0]

    def test_what_is_handed_in_is_left_as_it_was(self, data):
        X, y = (array.copy() for array in data)
        fit(X, y, WEIGHTS, columns="as-given")
        assert X.tolist() == data[0].tolist()
        assert y.tolist() == data[1].tolist()

    def test_whole_numbers_are_numbers(self):
        rng = np.random.default_rng(0)
        X = rng.integers(0, 3, (30, 10))
        assert fit(X, X[:, 0] * 5, 1).support.tolist() == [0]


GOOD = {"X": [[1.0, 0.0], [0.0, 2.0], [1.0, 1.0]], "y": [1.0, 2.0, 3.0], "weights": [2.0, 1.0]}


@pytest.mark.parametrize(
    ("wrong", "message"),
    [
        ({"X": [[1.0, np.nan], [0.0, 2.0], [1.0, 1.0]]},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not nan at (0, 1)"),
        ({"X": [1.0, 2.0, 3.0]},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not one of shape (3,)"),
        ({"X": np.empty((3, 0))},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not one of shape (3, 0)"),
        ({"X": [["a"]]},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not [['a']]"),
        ({"X": [[1.0], [1.0, 2.0]]},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not [[1.0], [1.0, 2.0]]"),
        ({"X": [[True, False]] * 3},
         "X must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not [[True, False], [True, False], [True, False]]"),
        ({"X": [[1.0, 0.1], [0.0, 0.1], [1.0, 0.1]]},
         "X must have columns that vary, not one and the same value in column 1"),
        ({"X": [[0.0, 0.1], [0.0, 0.2], [0.0, 0.1]], "intercept": False},
         "X must have columns that vary, not only zeros in column 0"),
        ({"y": [1.0, np.inf, 3.0]},
         "y must be 3 finite numbers, one a row of X, not inf at 1"),
        ({"y": [1.0, 2.0]},
         "y must be 3 finite numbers, one a row of X, not an array of shape (2,)"),
        ({"y": None}, "y must be 3 finite numbers, one a row of X, not None"),
        ({"weights": [1.0]},
         "weights must be one number or 2, one a column of X, not an array of shape (1,)"),
        ({"weights": "x"}, "weights must be one number or 2, one a column of X, not 'x'"),
        ({"weights": [1.0, -1.0]}, "weights must be finite numbers at least 0, not -1 at 1"),
        ({"weights": np.nan}, "weights must be finite numbers at least 0, not nan at 0"),
        ({"weights": [1.0, 1.5]},
         "weights must not rise from one rank to the next, not 1, 1.5 at ranks 1, 2"),
        ({"weights": [0.0, 0.0]}, "weights must begin above 0, not 0"),
        ({"columns": "unit"},
         "columns must be 'unit-length' or 'unit-variance' or 'as-given', not 'unit'"),
        ({"loss": 1}, "loss must be 'sum' or 'mean', not 1"),
        ({"intercept": 1}, "intercept must be True or False, not 1"),
        ({"gap": 0.0}, "gap must be a finite number above 0 and below 1, not 0"),
        ({"gap": None}, "gap must be a finite number above 0 and below 1, not None"),
    ],
)  # fmt: skip
def test_refusals(wrong, message):
    arguments = GOOD | wrong
    with pytest.raises(ValueError, match=f"^{re.escape(message)}$"):
        fit(**arguments)


@pytest.mark.parametrize(
    ("scales", "message"),
    [
        ([1.0, 0.0], "scales must be a list of finite numbers above 0, not 0 at 1"),
        (1.0, "scales must be a list of finite numbers above 0, not an array of shape ()"),
        (["x"], "scales must be a list of finite numbers above 0, not ['x']"),
    ],
)
def test_refusals_of_scales(scales, message):
    with pytest.raises(ValueError, match=f"^{re.escape(message)}$"):
        path(**GOOD, scales=scales)


def test_a_constant_column_is_a_column_where_there_is_no_intercept():
    X = [[1.0, 0.3], [1.0, 0.1], [1.0, 0.2]]
    assert fit(X, [2.0, 2.1, 1.9], 0.5, intercept=False).support.tolist() == [0]
