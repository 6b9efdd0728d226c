"""Designs: every column has mean 0 and variance 1 in its law, and the correlation asked for."""

import re

import numpy as np
import pytest

from engine.designs import design_of

RUNS = 20_000


def drawn(runs=RUNS, candidates=25, seed=0, **options):
    return design_of(**options).draw(runs, candidates, np.random.default_rng(seed))


@pytest.mark.parametrize(
    "options",
    [
        {"kind": "gaussian"},
        {"kind": "rademacher"},
        {"kind": "counts"},
        {"kind": "counts", "frequencies": (0.3, 0.2)},
        {"kind": "heavy"},
        {"kind": "ar1", "correlation": -0.7},
        {"kind": "blocks", "correlation": 0.6},
    ],
    ids=str,
)
def test_mean_and_variance(options):
    X = drawn(**options)
    # 5 standard errors; a variance has one of sqrt((kurtosis - 1) / runs), and the kurtosis is
    # 9 for the t with 5 degrees of freedom, below 8 for the others.
    assert X.mean(axis=0) == pytest.approx(np.zeros(25), abs=5.0 / np.sqrt(RUNS))
    assert X.var(axis=0) == pytest.approx(np.ones(25), abs=5.0 * np.sqrt(8.0 / RUNS))


def correlations(**options):
    return np.corrcoef(drawn(**options).T)


def test_correlations():
    """5 standard errors of at most 1 / sqrt(runs) each."""
    slack = 5.0 / np.sqrt(RUNS)
    apart = np.abs(np.subtract.outer(np.arange(25), np.arange(25)))
    ar1 = correlations(kind="ar1", correlation=0.8)
    assert ar1 == pytest.approx(0.8**apart, abs=slack)
    block = np.arange(25) // 10
    together = np.where(np.equal.outer(block, block), 0.6, 0.0)
    np.fill_diagonal(together, 1.0)
    assert correlations(kind="blocks", correlation=0.6) == pytest.approx(together, abs=slack)
    assert correlations(kind="gaussian") == pytest.approx(np.eye(25), abs=slack)


def test_counts_are_three_numbers_at_their_frequencies():
    values, counts = np.unique(
        drawn(kind="counts", frequencies=(0.1, 0.02)), return_counts=True
    )
    assert values.size == 3
    assert np.diff(values)[0] == pytest.approx(np.diff(values)[1])
    # 5 standard errors of sqrt(f (1 - f) / N), N = 500,000.
    assert counts / counts.sum() == pytest.approx([0.88, 0.1, 0.02], abs=2.5e-3)


def test_signs():
    assert set(np.unique(drawn(kind="rademacher"))) == {-1.0, 1.0}


class TestOwn:
    matrix = np.random.default_rng(1).uniform(2.0, 1e6, size=(40, 6))

    def test_columns_are_standardised(self):
        X = drawn(40, 6, kind="own", matrix=self.matrix, resample=False)
        assert X.mean(axis=0) == pytest.approx(np.zeros(6), abs=1e-12)
        assert X.std(axis=0) == pytest.approx(np.ones(6), abs=1e-12)
        expected = (self.matrix - self.matrix.mean(axis=0)) / self.matrix.std(axis=0)
        assert np.abs(X - expected).max() < 1e-12

    def test_rows_are_drawn_with_replacement(self):
        own = {
            tuple(row) for row in drawn(40, 6, kind="own", matrix=self.matrix, resample=False)
        }
        X = drawn(100, 6, kind="own", matrix=self.matrix)
        rows = {tuple(row) for row in X}
        assert rows < own or rows == own
        assert len(X) == 100 > len(rows)
        assert X.tolist() != drawn(100, 6, seed=1, kind="own", matrix=self.matrix).tolist()


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"kind": "normal"},
         "kind must be 'gaussian' or 'rademacher' or 'counts' or 'heavy' or 'ar1' or 'blocks' "
         "or 'own', not 'normal'"),
        ({"kind": "ar1"}, "correlation must be given for the design 'ar1', not None"),
        ({"kind": "own"}, "matrix must be given for the design 'own', not None"),
        ({"correlation": 0.5},
         "correlation must be left out for the design 'gaussian', not 0.5"),
        ({"kind": "heavy", "frequencies": (0.1, 0.1)},
         "frequencies must be left out for the design 'heavy', not (0.1, 0.1)"),
        ({"kind": "ar1", "correlation": 1.0},
         "correlation must be a finite number above -1 and below 1, not 1"),
        ({"kind": "blocks", "correlation": -0.1},
         "correlation must be a finite number at least 0 and below 1, not -0.1"),
        ({"kind": "counts", "frequencies": (0.9, 0.1)},
         "frequencies must be two numbers at least 0 that sum to more than 0 and less than 1, "
         "not (0.9, 0.1)"),
        ({"kind": "counts", "frequencies": 0.1},
         "frequencies must be two numbers at least 0 that sum to more than 0 and less than 1, "
         "not 0.1"),
        ({"kind": "counts", "frequencies": (float("nan"), 0.1)},
         "frequencies must be two numbers at least 0 that sum to more than 0 and less than 1, "
         "not (nan, 0.1)"),
        ({"kind": "own", "matrix": [[1.0, 0.3], [2.0, 0.3]]},
         "matrix must have columns that vary, not one and the same value in column 1"),
        ({"kind": "own", "matrix": [[1.0, np.nan]]},
         "matrix must be a matrix of finite numbers, a row a run and a column a candidate, "
         "not nan at (0, 1)"),
        ({"resample": 1}, "resample must be True or False, not 1"),
    ],
)  # fmt: skip
def test_refusals(options, message):
    with pytest.raises(ValueError, match=f"^{re.escape(message)}$"):
        design_of(**options)
