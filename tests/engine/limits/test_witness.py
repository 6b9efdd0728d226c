import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import isotonic_regression

from engine import lasso_boundary, power_limit, sorted_l1_boundary
from engine.limits.lasso import lasso_witness
from engine.limits.sorted_l1_witness import sorted_l1_witness
from engine.limits.witness import Law, Witness

RATIOS = st.floats(math.log(0.01), math.log(20.0)).map(math.exp)
SPARSITIES = st.one_of(
    st.floats(0.0005, 0.98), st.floats(math.log(0.0005), math.log(0.98)).map(math.exp)
)
TPPS = st.one_of(st.floats(0.001, 1.0 - 1e-8), st.just(1.0))
RANKS = (np.arange(500) + 0.5) / 500


def witness_like(**changes):
    fields = {
        "penalty": "sorted-l1",
        "tpp": 0.8,
        "fdp": 0.7,
        "sampling_ratio": 0.3,
        "sparsity": 0.2,
        "zero_threshold": 0.7,
        "law": Law((1.5,), (1.0,)),
        "risk": 0.3,
        "slope": 0.2,
        "smallest_selected": 0.1,
        "profile": lambda shares: 2.0 - shares,
    }
    return Witness(**(fields | changes))


class TestWitness:
    def test_calibration(self):
        assert witness_like().calibration == pytest.approx(1.0 / 3.0)
        assert witness_like(slope=0.3 + 1e-9).calibration == 0.0

    def test_approached_names_the_reason(self):
        assert witness_like().approached == ""
        assert witness_like(slope=0.29999).approached.startswith("the weights tend to 0")
        huge = witness_like(law=Law((0.0, math.inf), (0.5, 0.5)))
        assert huge.approached.startswith("some effects have to")

    def test_resolved(self):
        assert witness_like().resolved
        assert not witness_like(smallest_selected=9e-4).resolved

    def test_normalised_weights_stand_at_the_middle_of_their_ranks(self):
        weights = witness_like().normalised_weights(4)
        assert weights.tolist() == [1.875, 1.625, 1.375, 1.125]


class TestSortedL1Witness:
    @settings(max_examples=150, deadline=None)
    @given(tpp=TPPS, ratio=RATIOS, sparsity=SPARSITIES)
    def test_attains_the_boundary_within_both_conditions(self, tpp, ratio, sparsity):
        witness = sorted_l1_witness(tpp, ratio, sparsity)
        assert witness.penalty == "sorted-l1"
        assert witness.fdp == sorted_l1_boundary(tpp, ratio, sparsity)
        # The boundary is solved to 1e-6 in the zero threshold, in steep places to less.
        assert witness.risk <= ratio * (1.0 + 3e-6)
        assert witness.slope <= ratio * (1.0 + 3e-6)
        profile = witness.profile(RANKS)
        assert np.isfinite(profile).all()
        assert np.diff(profile).max() <= 1e-12
        assert profile[-1] >= witness.zero_threshold * (1.0 - 1e-12)
        assert 0.0 <= witness.smallest_selected <= 0.1 + 1e-12

    def test_profile_falls_to_the_threshold_with_the_last_selected(self):
        witness = sorted_l1_witness(0.8, 0.3, 0.2)
        false = 0.2 * witness.tpp * witness.fdp / (1.0 - witness.fdp)
        selected = 0.2 * witness.tpp + false
        after = witness.profile(np.array([selected + 1e-6, 0.9, 1.0]))
        assert (after == witness.zero_threshold).all()

    @pytest.mark.parametrize(
        ("point", "reason"),
        [
            ((0.8, 0.3, 0.2), ""),
            ((0.2, 0.3, 0.2), "some effects"),
            ((1.0, 1.2, 0.9), "some effects"),
            ((0.196, 0.0832, 0.1206), "the weights tend to 0"),
        ],
    )
    def test_says_whether_the_point_is_attained(self, point, reason):
        assert sorted_l1_witness(*point).approached.startswith(reason)
        assert bool(reason) == bool(sorted_l1_witness(*point).approached)

    def test_bad_arguments(self):
        with pytest.raises(ValueError, match=r"sparsity must be .*, not 1"):
            sorted_l1_witness(0.5, 0.3, 1.0)
        with pytest.raises(ValueError, match=r"tpp must be .*, not"):
            sorted_l1_witness([0.5, 0.6], 0.3, 0.2)


class TestLassoWitness:
    @settings(max_examples=100, deadline=None)
    @given(tpp=TPPS, ratio=RATIOS, sparsity=SPARSITIES)
    def test_attains_the_boundary_within_both_conditions(self, tpp, ratio, sparsity):
        limit = power_limit(ratio, sparsity)
        if tpp >= limit < 1.0:
            tpp = 0.99 * limit
        witness = lasso_witness(tpp, ratio, sparsity)
        assert witness.fdp == pytest.approx(lasso_boundary(tpp, ratio, sparsity), rel=1e-9)
        assert witness.risk == pytest.approx(ratio, rel=1e-9)
        assert witness.slope <= ratio * (1.0 + 1e-9)
        assert (witness.profile(RANKS) == witness.zero_threshold).all()
        assert sum(witness.law.shares) == pytest.approx(1.0, abs=1e-12)

    def test_selected_share_is_the_sampling_ratio_at_the_power_limit(self):
        limit = power_limit(0.3, 0.2)
        assert lasso_witness(limit - 1e-9, 0.3, 0.2).slope == pytest.approx(0.3, abs=1e-6)

    def test_none_from_the_power_limit_on(self):
        rule = "tpp must be below the power limit, 0.567603 here, not 0.6"
        with pytest.raises(ValueError, match=rule):
            lasso_witness(0.6, 0.3, 0.2)
        with pytest.raises(ValueError, match="sampling_ratio must be"):
            lasso_witness(0.5, -0.3, 0.2)


# Large and vanishing effects, for drawing: far beyond the noise, and far below it.
_LARGE, _SMALL = 15.0, 1e-3


@pytest.mark.parametrize(
    "witness",
    [
        sorted_l1_witness(0.8, 0.3, 0.2),  # one size
        sorted_l1_witness(0.4, 0.3, 0.2),  # some outgrow the noise
        sorted_l1_witness(0.45, 0.1, 0.05),  # just past the power limit
        sorted_l1_witness(0.2, 0.05, 0.2),
        sorted_l1_witness(0.95, 1.2, 0.9),
        sorted_l1_witness(0.915, 0.0446, 0.00734),  # some of one size, the others tend to 0
        lasso_witness(0.5, 0.3, 0.2),
    ],
    ids=lambda witness: f"{witness.penalty} at {witness.tpp}",
)
def test_weights_on_drawn_estimates_give_the_point(witness):
    """The proximal step with the weights, on 400,000 estimates drawn from the law."""
    rng = np.random.default_rng(7)
    p, eps = 400_000, witness.sparsity
    actives = round(eps * p)
    sizes = np.clip(witness.law.sizes, _SMALL, _LARGE)
    pi = np.zeros(p)
    pi[:actives] = rng.choice(sizes, size=actives, p=witness.law.shares)
    estimate = pi + rng.standard_normal(p)
    fitted = proximal(estimate, witness.normalised_weights(p))

    errors = (fitted - pi) ** 2
    # Five standard errors, and 0.5 percent for the effects that only stand for infinite ones.
    noise = 5.0 * errors.std() / math.sqrt(p) + 0.005 * witness.risk
    assert errors.mean() == pytest.approx(witness.risk, abs=noise)
    distinct = np.unique(np.abs(fitted[fitted != 0.0]).round(12)).size / p
    if witness.resolved:
        found = fitted != 0.0
        tpp, false = found[:actives].mean(), found[actives:].sum()
        # Five binomial standard errors, and 0.005 for ranks that pool at the threshold's edge.
        assert tpp == pytest.approx(witness.tpp, abs=5.0 / math.sqrt(4 * actives) + 0.005)
        assert false / found.sum() == pytest.approx(
            witness.fdp, abs=5.0 / math.sqrt(4 * found.sum()) + 0.005
        )
    # Ties of neighbours in the sample keep the distinct sizes below the limit E eta'.
    assert distinct <= witness.slope + 5.0 * math.sqrt(witness.slope / p) + 0.005


def proximal(x, weights):
    """The sorted-L1 proximal step, from its definition as a regression on the sorted sizes."""
    order = np.argsort(-np.abs(x))
    pooled = isotonic_regression(np.abs(x)[order] - weights, increasing=False).x
    out = np.zeros_like(x)
    out[order] = np.maximum(pooled, 0.0)
    return np.sign(x) * out
