"""All boundaries over the whole domain: order, existence, shapes, messages."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import (
    critical_sparsity,
    lasso_boundary,
    power_limit,
    sorted_l1_boundary,
    two_level_boundary,
    two_level_closed_form,
)

BOUNDARIES = (lasso_boundary, two_level_closed_form, two_level_boundary, sorted_l1_boundary)

ratios = st.floats(math.log(0.01), math.log(20.0)).map(math.exp)
sparsities = st.one_of(
    st.floats(0.0005, 0.98), st.floats(math.log(0.0005), math.log(0.98)).map(math.exp)
)
shares = st.one_of(st.floats(0.001, 1.0), st.sampled_from([0.001, 0.999, 0.9999, 1.0]))


@settings(max_examples=250, deadline=None)
@given(shares, ratios, sparsities)
def test_order_and_existence(tpp, ratio, sparsity):
    lasso, closed, two_level, best = (f(tpp, ratio, sparsity) for f in BOUNDARIES)
    limit = power_limit(ratio, sparsity)
    assert 0.0 <= best <= two_level <= closed <= 1.0 - sparsity + 1e-12
    if limit < 1.0 and tpp >= limit:
        assert math.isnan(lasso)
    else:
        assert closed == lasso


@settings(max_examples=60, deadline=None)
@given(st.lists(shares, min_size=1, max_size=5), ratios, sparsities)
def test_scalars_and_arrays_agree_to_the_digit(tpp, ratio, sparsity):
    for boundary in BOUNDARIES:
        together = boundary(tpp, ratio, sparsity)
        alone = [boundary(u, ratio, sparsity) for u in tpp]
        assert np.array_equal(together, alone, equal_nan=True)


@settings(max_examples=60, deadline=None)
@given(ratios, sparsities)
def test_at_the_power_limit_the_selected_share_is_the_sampling_ratio(ratio, sparsity):
    limit = power_limit(ratio, sparsity)
    if limit < 1.0:
        fdp = two_level_closed_form(limit, ratio, sparsity)
        # The two sides are quotients of numbers near 1: their rounding is what differs.
        assert fdp == pytest.approx(1.0 - sparsity * limit / ratio, abs=1e-9)


@settings(max_examples=60, deadline=None)
@given(ratios, sparsities, st.floats(0.01, 0.98), st.floats(0.001, 0.02))
def test_more_tpp_costs_fdp(ratio, sparsity, tpp, more):
    for boundary in (two_level_closed_form, two_level_boundary, sorted_l1_boundary):
        low, high = boundary([tpp, tpp + more], ratio, sparsity)
        assert low <= high + 5e-5  # the accuracy of the exact two-level search


@settings(max_examples=60, deadline=None)
@given(ratios, sparsities, st.floats(0.01, 0.99))
def test_more_runs_never_raise_the_lowest_fdp(ratio, sparsity, tpp):
    for boundary in (two_level_closed_form, two_level_boundary, sorted_l1_boundary):
        few, many = boundary(tpp, [ratio, 1.05 * ratio], sparsity)
        assert many <= few + 5e-5  # the accuracy of the exact two-level search


def test_the_lasso_ends_exactly_at_its_power_limit():
    limit = power_limit(0.3, 0.2)
    assert math.isnan(lasso_boundary(limit, 0.3, 0.2))
    assert lasso_boundary(math.nextafter(limit, 0.0), 0.3, 0.2) < 1.0


@pytest.mark.parametrize("ratio", [1.0, 1.5, 20.0])
def test_from_a_ratio_of_1_on_there_is_no_transition(ratio):
    assert critical_sparsity(ratio) == 1.0
    assert power_limit(ratio, 0.97) == 1.0


def test_the_transition_at_both_ends():
    # Near 1 it tends to 1; for small ratios eps* = ratio / (2 log(1 / ratio)) to first order
    # (textbook asymptotics), which overstates it while the logarithm grows.
    near = critical_sparsity(1.0 - np.array([1e-2, 1e-6, 1e-12]))
    assert np.all(np.diff(near) > 0.0)
    assert near[-1] > 0.999
    for ratio in (1e-3, 1e-6, 1e-12, 1e-100):
        first_order = ratio / (2.0 * math.log(1.0 / ratio))
        assert 0.5 * first_order < critical_sparsity(ratio) < 1.2 * first_order


def test_the_transition_rises():
    ratio = np.geomspace(1e-8, 0.999999, 2000)
    assert np.all(np.diff(critical_sparsity(ratio)) > 0.0)


def test_beyond_the_transition_all_ends_at_random_picks():
    for boundary in (two_level_closed_form, two_level_boundary, sorted_l1_boundary):
        assert boundary(1.0, 0.3, 0.2) == pytest.approx(0.8, abs=1e-12)


def test_the_lasso_rises_with_sparsity_where_sorted_l1_does_not():
    # Common practice, no source: at a fixed ratio the sorted-L1 trade-off is not monotone.
    sparsity = np.linspace(0.05, 0.9, 18)
    lasso = lasso_boundary(0.1, 0.3, sparsity)
    best = sorted_l1_boundary(0.6, 0.3, sparsity)
    assert np.all(np.diff(lasso[:8]) > 0.0)
    signs = set(np.sign(np.diff(best)))
    assert {-1.0, 1.0} <= signs


def test_shapes_are_those_of_the_arguments():
    for boundary in BOUNDARIES:
        assert isinstance(boundary(0.3, 0.5, 0.1), float)
        assert boundary([0.3], 0.5, 0.1).shape == (1,)
        assert boundary([[0.3], [0.5]], [0.5, 0.6, 0.7], 0.1).shape == (2, 3)
        assert boundary(np.empty((0, 2)), 0.5, 0.1).shape == (0, 2)
        assert boundary(1, 2, 0.5) == boundary(1.0, 2.0, 0.5)


@pytest.mark.parametrize("boundary", BOUNDARIES)
@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((0.0, 0.3, 0.2), "^tpp must be a finite number above 0 and at most 1, not 0$"),
        ((1.1, 0.3, 0.2), "^tpp must be a finite number above 0 and at most 1, not 1.1$"),
        (([0.5, -1.0], 0.3, 0.2), "^tpp must be .*, not -1$"),
        ((0.5, 0.0, 0.2), "^sampling_ratio must be a finite number above 0, not 0$"),
        ((0.5, math.inf, 0.2), "^sampling_ratio must be .*, not inf$"),
        ((0.5, 0.3, 1.0), "^sparsity must be a finite number above 0 and below 1, not 1$"),
        ((0.5, 0.3, math.nan), "^sparsity must be .*, not nan$"),
        (("0.5", 0.3, 0.2), "^tpp must be .*, not '0.5'$"),
        ((True, 0.3, 0.2), "^tpp must be .*, not True$"),
        ((None, 0.3, 0.2), "^tpp must be .*, not None$"),
        ((0.5 + 0j, 0.3, 0.2), r"^tpp must be .*, not \(0.5\+0j\)$"),
        (([[0.5], [0.1, 0.2]], 0.3, 0.2), r"^tpp must be .*, not \[\[0.5\], \[0.1, 0.2\]\]$"),
        (
            ([0.1, 0.2], [0.3, 0.4, 0.5], 0.2),
            "^arguments must have shapes that broadcast, not tpp",
        ),
    ],
)
def test_messages_name_argument_rule_and_value(boundary, arguments, message):
    with pytest.raises(ValueError, match=message):
        boundary(*arguments)


def test_messages_of_the_transition():
    with pytest.raises(
        ValueError, match="^sampling_ratio must be a finite number above 0, not -1$"
    ):
        critical_sparsity(-1)
    with pytest.raises(ValueError, match="^sparsity must be .*, not 0$"):
        power_limit(0.5, 0)
