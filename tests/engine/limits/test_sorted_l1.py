import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import (
    critical_sparsity,
    lasso_boundary,
    sorted_l1_boundary,
    two_level_closed_form,
)
from engine.limits.least_risk import least_risk
from engine.limits.polar import risk_at
from engine.limits.sorted_l1 import optima, size_of
from engine.normal import selection

RATIOS = st.floats(math.log(0.01), math.log(20.0)).map(math.exp)
SPARSITIES = st.one_of(
    st.floats(0.0005, 0.98), st.floats(math.log(0.0005), math.log(0.98)).map(math.exp)
)
TPPS = st.one_of(
    st.floats(0.001, 1.0 - 1e-8),
    st.floats(-8.0, -1.0).map(lambda power: 1.0 - 10.0**power),
    st.just(1.0),
)


class TestDomain:
    @settings(max_examples=300, deadline=None)
    @given(tpp=TPPS, ratio=RATIOS, sparsity=SPARSITIES)
    def test_order(self, tpp, ratio, sparsity):
        fdp = sorted_l1_boundary(tpp, ratio, sparsity)
        assert 0.0 <= fdp <= two_level_closed_form(tpp, ratio, sparsity)
        # Picking at random has FDP 1 - sparsity. (The difference rounds.)
        assert fdp <= 1.0 - sparsity + 1e-11
        lasso = lasso_boundary(tpp, ratio, sparsity)
        assert math.isnan(lasso) or fdp <= lasso

    @settings(max_examples=40, deadline=None)
    @given(points=st.lists(st.tuples(TPPS, RATIOS, SPARSITIES), min_size=1, max_size=6))
    def test_arrays_and_scalars_agree_to_the_digits(self, points):
        together = sorted_l1_boundary(*np.array(points).T)
        assert together.tolist() == [sorted_l1_boundary(*point) for point in points]

    @pytest.mark.parametrize("ratio", [1e-8, 1e-3, 0.999999, 1.0, 1.000001, 20.0, 1e8])
    @pytest.mark.parametrize("sparsity", [1e-9, 1e-4, 0.5, 0.98, 1.0 - 1e-9])
    def test_far_corners(self, ratio, sparsity):
        tpp = np.array([1e-9, 1e-3, 0.5, 0.999, 1.0 - 1e-12, 1.0])
        fdp = sorted_l1_boundary(tpp, ratio, sparsity)
        assert ((fdp >= 0.0) & (fdp <= two_level_closed_form(tpp, ratio, sparsity))).all()

    def test_broadcasting(self):
        tpp, ratio = np.array([[0.3], [0.8]]), np.array([0.3, 0.6, 1.2])
        fdp = sorted_l1_boundary(tpp, ratio, 0.2)
        assert fdp.shape == (2, 3)
        assert fdp[1, 2] == sorted_l1_boundary(0.8, 1.2, 0.2)
        assert isinstance(sorted_l1_boundary(0.8, 1.2, 0.2), float)

    @pytest.mark.parametrize(
        ("arguments", "message"),
        [
            ((0.0, 0.3, 0.2), "tpp must be a finite number above 0 and at most 1, not 0"),
            ((1.1, 0.3, 0.2), "tpp must be a finite number above 0 and at most 1, not 1.1"),
            ((0.5, 0.0, 0.2), "sampling_ratio must be a finite number above 0, not 0"),
            ((0.5, math.inf, 0.2), "sampling_ratio must be a finite number above 0, not inf"),
            ((0.5, 0.3, 1.0), "sparsity must be a finite number above 0 and below 1, not 1"),
            ((0.5, 0.3, math.nan), "sparsity must be a finite number .*, not nan"),
            (("x", 0.3, 0.2), "tpp must be a finite number .*, not 'x'"),
            (([0.1, 0.2], [0.3] * 3, 0.2), "shapes that broadcast"),
        ],
    )
    def test_bad_arguments(self, arguments, message):
        with pytest.raises(ValueError, match=message):
            sorted_l1_boundary(*arguments)


class TestShape:
    @settings(max_examples=60, deadline=None)
    @given(tpp=st.floats(0.005, 0.999), ratio=RATIOS, sparsity=SPARSITIES)
    def test_falls_with_the_sampling_ratio(self, tpp, ratio, sparsity):
        more = sorted_l1_boundary(tpp, 1.05 * ratio, sparsity)
        assert more <= sorted_l1_boundary(tpp, ratio, sparsity) + 2e-6

    @settings(max_examples=60, deadline=None)
    @given(tpp=st.floats(0.005, 0.98), ratio=RATIOS, sparsity=SPARSITIES)
    def test_rises_with_the_tpp(self, tpp, ratio, sparsity):
        more = sorted_l1_boundary(1.01 * tpp, ratio, sparsity)
        assert more >= sorted_l1_boundary(tpp, ratio, sparsity) - 2e-6

    @pytest.mark.parametrize(
        ("ratio", "sparsity"), [(0.3, 0.2), (0.1, 0.05), (0.05, 0.2), (0.03, 0.005), (1.2, 0.9)]
    )
    def test_no_jumps_where_the_best_law_changes(self, ratio, sparsity):
        tpp = np.linspace(0.05, 0.95, 400)
        steps = np.diff(sorted_l1_boundary(tpp, ratio, sparsity))
        closed = np.diff(two_level_closed_form(tpp, ratio, sparsity))
        # The boundary may be steep, but no steeper than twice the closed form's steepest.
        assert steps.max() <= 2.0 * closed.max()
        assert steps.min() >= -2e-6

    def test_equals_the_lasso_only_in_rounding(self):
        # The risks differ by eps l null_risk(b) / 2 alone: lost in rounding at a threshold of
        # 9 but not at 2.6.
        assert sorted_l1_boundary(0.2, 0.3, 0.2) < lasso_boundary(0.2, 0.3, 0.2) - 1e-5
        assert sorted_l1_boundary(0.02, 0.3, 0.2) == pytest.approx(
            lasso_boundary(0.02, 0.3, 0.2), rel=1e-9
        )


class TestEnds:
    @pytest.mark.parametrize(("ratio", "sparsity"), [(0.3, 0.2), (0.1, 0.1), (0.02, 0.98)])
    def test_random_picks_at_tpp_one_in_dense_studies(self, ratio, sparsity):
        assert sparsity > critical_sparsity(ratio)
        assert sorted_l1_boundary(1.0, ratio, sparsity) == pytest.approx(1.0 - sparsity)

    def test_better_than_random_picks_at_tpp_one_in_very_dense_studies(self):
        # Effects of one large size are denoised to half their noise: at sampling ratio 0.6 the
        # polar law is within the ratio at every sparsity from 0.8 on.
        assert sorted_l1_boundary(1.0, 0.6, 0.9) < 0.0941 < 1.0 - 0.9
        assert math.isnan(lasso_boundary(0.9999, 0.6, 0.9))

    @pytest.mark.parametrize(
        ("ratio", "sparsity"), [(1.2, 0.9), (0.3, 0.08), (0.6, 0.9), (0.3, 0.2), (5.0, 0.3)]
    )
    def test_tpp_one_is_the_limit_from_below(self, ratio, sparsity):
        tpp = 1.0 - 10.0 ** -np.arange(3.0, 12.0)
        fdp = sorted_l1_boundary(tpp, ratio, sparsity)
        gaps = sorted_l1_boundary(1.0, ratio, sparsity) - fdp
        # At 1 - TPP = 1e-3 the gap is 1e-3 at most, and it goes on shrinking.
        assert 0.0 <= gaps[0] < 1e-3
        assert np.all(np.diff(gaps) <= 1e-6)
        assert gaps[-1] < 1e-6

    def test_small_tpp_in_sparse_studies_underflows_to_zero(self):
        assert sorted_l1_boundary(0.001, 20.0, 0.0005) == 0.0


class TestOptimum:
    """The law that is reported has the TPP and, with its best shrinkage, the risk it claims."""

    @settings(max_examples=150, deadline=None)
    @given(tpp=TPPS, ratio=RATIOS, sparsity=SPARSITIES)
    def test_law_has_the_tpp_and_risk(self, tpp, ratio, sparsity):
        (best,) = optima(np.array(tpp), np.array(ratio), np.array(sparsity))
        assert sum(best.shares) == pytest.approx(1.0, abs=1e-12)
        chance = [
            1.0
            if math.isinf(size)
            else float(selection(np.array(size), np.array(best.threshold)))
            for size in best.sizes
        ]
        assert np.dot(chance, best.shares) == pytest.approx(tpp, rel=1e-9)
        if math.isinf(best.sizes[-1]):
            share = np.array(sparsity * best.shares[-1])
            levels = np.linspace(best.threshold, best.threshold + 3.0, 3001)
            risk = risk_at(levels, share).min()  # the level is the threshold or above
        else:
            risk = least_risk(
                best.threshold, best.sizes, tuple(sparsity * share for share in best.shares)
            ).risk
        if best.sizes == (0.0,):
            assert risk < ratio
        else:
            # Accuracy of the secant, of the levels' grid, and of the quadrature.
            assert risk == pytest.approx(ratio, rel=3e-6)

    def test_fdp_is_that_of_the_threshold_and_the_closed_form_never_steps_in(self):
        rng = np.random.default_rng(1)
        tpp = rng.uniform(0.001, 1.0, 600)
        ratio = np.exp(rng.uniform(np.log(0.01), np.log(3.0), 600))
        sparsity = np.exp(rng.uniform(np.log(0.0005), np.log(0.98), 600))
        closed = two_level_closed_form(tpp, ratio, sparsity)
        for best, u, eps, ceiling in zip(
            optima(tpp, ratio, sparsity), tpp, sparsity, closed, strict=True
        ):
            false = (1.0 - eps) * float(selection(np.array(0.0), np.array(best.threshold)))
            fdp = false / (false + eps * u)
            assert best.fdp == pytest.approx(fdp, rel=1e-9)
            assert fdp <= ceiling * (1.0 + 1e-9)


@pytest.mark.parametrize("alpha", [1e-9, 0.01, 0.7, 3.0, 6.0])
@pytest.mark.parametrize("size", [1e-3, 0.3, 2.0, 9.0])
def test_size_of_inverts_the_chance_of_being_found(alpha, size):
    found = float(selection(np.array(size), np.array(alpha)))
    if found < 1.0 - 1e-12:
        back = float(selection(np.array(size_of(alpha, found)), np.array(alpha)))
        assert back == pytest.approx(found, rel=1e-12)


def test_size_of_is_zero_where_nulls_are_found_as_often():
    assert size_of(0.5, 0.3) == 0.0
