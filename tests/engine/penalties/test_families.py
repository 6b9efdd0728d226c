"""Shrinkages of the families: against each other, a finite prox, and simulated moments."""

import numpy as np
import pytest

from engine.fit.prox import prox
from engine.penalties.designed import Designed
from engine.penalties.lasso import Lasso
from engine.penalties.penalty import Law
from engine.penalties.ramp import Ramp, TunedRamp
from engine.penalties.two_level import TunedTwoLevel, TwoLevel
from engine.penalties.weights import Weights

LAW = Law(np.array([1.5, 3.0]), np.array([0.1, 0.1]))
EVERY = [Lasso(), Designed(), Ramp(0.2), TunedRamp(), TwoLevel(1.3, 1.0, 0.05),
         TunedTwoLevel(0.6), Weights((3.0, 2.0, 2.0))]  # fmt: skip


@pytest.mark.parametrize("penalty", EVERY, ids=lambda penalty: type(penalty).__name__)
def test_the_limit_is_that_of_the_prox_of_its_own_finite_weights(penalty):
    """200,000 candidates: risk and selected share within 5 standard errors (some .003)."""
    p, threshold = 200_000, 1.2
    shape = penalty.shape(threshold, LAW)
    assert shape.admissible
    rng = np.random.default_rng(3)
    pi = np.zeros(p)
    pi[: p // 10], pi[p // 10 : p // 5] = 1.5, 3.0
    x = pi + rng.normal(size=p)
    eta = prox(x, shape.weights(np.arange(1.0, p + 1.0), p))
    loss = (eta - pi) ** 2
    assert shape.risk == pytest.approx(loss.mean(), abs=5.0 * loss.std() / np.sqrt(p))
    selected = np.count_nonzero(eta) / p
    wanted = float(LAW.beyond(np.array([threshold]))[0])
    assert selected == pytest.approx(wanted, abs=5.0 * 0.5 / np.sqrt(p))
    # Stein: E eta' = (risk - E (eta - x)^2 ... + 1) / 2 holds for the limit's own numbers.
    withheld = ((x - eta) ** 2).mean()
    assert shape.slope == pytest.approx(0.5 * (shape.risk + 1.0 - withheld), abs=0.01)


def test_designed_has_the_least_risk():
    best = Designed().shape(1.2, LAW).risk
    for penalty in EVERY:
        assert best <= penalty.shape(1.2, LAW).risk + 1e-7
