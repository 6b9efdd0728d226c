"""Runs of equal weights: the same as from writing every weight down, and never too many."""

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.limits.families import witness
from engine.run_lengths import MOST_RUNS, run_lengths


def every_weight(profile, candidates):
    """The naive way, for few candidates."""
    pairs = []
    for weight in profile((np.arange(candidates) + 0.5) / candidates):
        value = float(f"{weight:.6g}")
        if pairs and pairs[-1][0] == value:
            pairs[-1] = (value, pairs[-1][1] + 1)
        else:
            pairs.append((value, 1))
    return pairs


@st.composite
def falling(draw):
    """A nonincreasing profile: straight lines through knots, or steps."""
    sizes = st.floats(0.0, 1e6) | st.floats(0.0, 1e-9) | st.sampled_from([0.0, 1.0, 2.0])
    heights = np.sort(draw(st.lists(sizes, min_size=2, max_size=8)))[::-1]
    knots = np.linspace(0.0, 1.0, len(heights))
    if draw(st.booleans()):
        return lambda shares: np.interp(shares, knots, heights)
    return lambda shares: heights[np.searchsorted(knots, shares) - 1]


@settings(max_examples=150, deadline=None)
@given(falling(), st.integers(1, MOST_RUNS))
def test_few_candidates_keep_six_digits_each(profile, candidates):
    assert run_lengths(profile, candidates) == every_weight(profile, candidates)


@settings(max_examples=60, deadline=None)
@given(falling(), st.integers(MOST_RUNS, 10**9))
def test_runs_are_few_fall_and_count_the_candidates(profile, candidates):
    pairs = run_lengths(profile, candidates)
    values = [value for value, _ in pairs]
    assert 1 <= len(pairs) <= MOST_RUNS
    assert all(lower < upper for upper, lower in itertools.pairwise(values))
    assert sum(count for _, count in pairs) == candidates
    assert all(type(count) is int and count >= 1 for _, count in pairs)


@pytest.mark.parametrize("tpp", [0.5, 0.8, 1.0])
def test_many_candidates_keep_each_weight_to_half_a_step(tpp):
    """The finest steps that give at most 2000 runs give more than 2000 / 2.5 of them or so."""
    found = witness("sorted-l1", tpp, 0.05, 0.3)
    exact = found.normalised_weights(20_000)
    values, counts = zip(*run_lengths(found.profile, 20_000), strict=True)
    # Equal steps of 1, 2 or 5 times a power of ten: the next finer one was too fine by itself.
    step = min(1.0, np.min(-np.diff(values)))
    digit = round(step, 12) / 10.0 ** math.floor(math.log10(step) + 1e-9)
    assert round(digit, 6) in (1.0, 2.0, 5.0)
    assert np.ptp(exact) / (step / 2.5) > MOST_RUNS / 2
    assert np.max(np.abs(np.repeat(values, counts) - exact)) <= step / 2 * (1 + 1e-9)


def test_few_runs_stay_exact_however_many_candidates():
    assert run_lengths(lambda r: np.where(r < 0.25, 1.23456, 0.5), 10**9) == [
        (1.23456, 250_000_000),
        (0.5, 750_000_000),
    ]


def test_the_step_is_the_finest_that_will_do():
    # 3,001 values of six digits; every second one is left.
    pairs = run_lengths(lambda r: 2.03 - 0.03 * r, 10**6)
    assert len(pairs) == 1501
    assert [value for value, _ in pairs[:3]] == [2.03, 2.02998, 2.02996]
