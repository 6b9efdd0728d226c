"""The proximal map of sorted L1 and its clusters: worked values, and what defines them."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.fit.prox import clusters, prox, prox_blocks
from tests.bench.fista import stack_prox

ROUNDING = 1e-12  # some tens of units in the last place of numbers up to 10


def cases(largest=12):
    """Vectors with nonincreasing weights; small whole steps make ties common."""
    entry = st.integers(-8, 8).map(lambda i: i / 2.0)
    weight = st.integers(0, 6).map(lambda i: i / 2.0)
    pair = st.lists(st.tuples(entry, weight), min_size=1, max_size=largest)
    return pair.map(
        lambda pairs: (
            np.array([v for v, _ in pairs]),
            np.sort(np.array([w for _, w in pairs]))[::-1],
        )
    )


# Worked by hand; an independent convex solver agrees to 2e-6.
@pytest.mark.parametrize(
    ("v", "weights", "expected"),
    [
        ((5, 4, 1), (3, 1, 0.5), (2.5, 2.5, 0.5)),
        ((3, -2.9, 1), (2, 1, 1), (1.45, -1.45, 0)),
        ((1, 1), (2, 0), (0, 0)),
        ((4, 3, 2, 1), (4, 2, 1, 0), (0.75, 0.75, 0.75, 0.75)),
        ((0.5, -6, 6), (4, 1, 0.4), (0.1, -3.5, 3.5)),
    ],
)
def test_worked_by_hand(v, weights, expected):
    found = prox(np.array(v, float), np.array(weights, float))
    assert found == pytest.approx(np.array(expected), abs=ROUNDING)


@given(cases())
@settings(max_examples=60)
def test_the_stack_algorithm_agrees(case):
    assert prox(*case) == pytest.approx(stack_prox(*case), abs=ROUNDING)


@given(cases())
@settings(max_examples=60)
def test_what_is_taken_off_is_a_subgradient(case):
    """v - x is in the dual ball, and meets the penalty at x: that is what the map means."""
    v, weights = case
    x = prox(v, weights)
    taken = np.sort(np.abs(v - x))[::-1]
    assert (np.cumsum(taken) <= np.cumsum(weights) + ROUNDING).all()
    assert (v - x) @ x == pytest.approx(weights @ np.sort(np.abs(x))[::-1], abs=1e-10)


@given(cases())
@settings(max_examples=60)
def test_blocks_are_the_clusters_of_the_map(case):
    """Neighbouring blocks of the regression differ, so they are the clusters exactly."""
    x, blocks = prox(*case), prox_blocks(*case)
    assert sorted(blocks.members) == np.flatnonzero(x).tolist()
    assert (np.sign(x[blocks.members]) == blocks.signs).all()
    sizes = np.abs(x[blocks.members])
    assert np.repeat(sizes[blocks.starts], blocks.sizes).tolist() == sizes.tolist()
    if case[1][0] > case[1][-1]:  # equal weights keep each entry a block of its own
        assert blocks.starts.size == clusters(x).starts.size


def test_equal_weights_threshold_softly():
    v = np.array([3.0, -1.0, 0.5, -2.0])
    assert prox(v, np.full(4, 1.5)).tolist() == [1.5, 0.0, 0.0, -0.5]


def test_zeros_have_no_sign():
    assert not np.signbit(prox(np.array([-1.0, -3.0]), np.array([2.0, 1.5]))[0])


def test_clusters_of_a_vector():
    found = clusters(np.array([0.0, -2.0, 1.0, 2.0, 0.0, 3.0]))
    assert found.members.tolist() == [5, 1, 3, 2]
    assert found.signs.tolist() == [1.0, -1.0, 1.0, 1.0]
    assert found.starts.tolist() == [0, 1, 3]
    assert found.sizes.tolist() == [1, 2, 1]
    assert found.sums(np.array([1.0, 10.0, 100.0, 1000.0])).tolist() == [1.0, 110.0, 1000.0]


def test_clusters_of_nothing():
    found = clusters(np.zeros(3))
    assert found.members.size == found.starts.size == found.sizes.size == 0
