"""The drawn lasso curve against the boundary it draws."""

import numpy as np
import pytest

from engine import lasso_boundary, power_limit
from engine.limits.lasso_curve import lasso_curve


@pytest.mark.parametrize("ratio", [0.01, 0.1, 0.3, 0.9, 1.0, 1.5, 20.0])
@pytest.mark.parametrize("sparsity", [0.0005, 0.01, 0.2, 0.6, 0.98])
def test_it_draws_the_boundary(ratio, sparsity):
    tpp, fdp = lasso_curve(ratio, sparsity)
    limit = power_limit(ratio, sparsity)
    assert (tpp[-1], fdp[-1]) == (0.0, 0.0)
    assert np.all(np.diff(tpp) <= 0.0)
    # It ends to 1e-4 at the power limit, from a table; between, 256 points make chords.
    assert tpp[0] == pytest.approx(limit, abs=1e-4)
    inside = np.linspace(0.02, 0.998, 60) * limit
    drawn = np.interp(inside, tpp[::-1], fdp[::-1])
    assert drawn == pytest.approx(lasso_boundary(inside, ratio, sparsity), abs=1e-4)
