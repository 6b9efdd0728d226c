"""The registry of penalties, and the witness of each by name."""

import math

import pytest

from engine import lasso_boundary, sorted_l1_boundary, two_level_boundary, two_level_closed_form
from engine.limits.families import FAMILIES, witness


def test_the_penalties_in_their_order():
    rows = [(family.key, family.label, family.boundary) for family in FAMILIES.values()]
    assert rows == [
        ("lasso", "lasso", lasso_boundary),
        ("two-level-closed-form", "two-level, closed form", two_level_closed_form),
        ("two-level", "two-level", two_level_boundary),
        ("sorted-l1", "sorted L1", sorted_l1_boundary),
    ]
    assert list(FAMILIES) == [key for key, _, _ in rows]


@pytest.mark.parametrize("key", [key for key, family in FAMILIES.items() if family.witness])
def test_a_witness_has_the_fdp_of_its_boundary(key):
    found = witness(key, 0.5, 0.3, 0.2)
    assert found.penalty == key
    assert found.fdp == FAMILIES[key].boundary(0.5, 0.3, 0.2)
    assert (found.tpp, found.sampling_ratio, found.sparsity) == (0.5, 0.3, 0.2)


@pytest.mark.parametrize("penalty", ["two-level-closed-form", "LASSO", "", None])
def test_what_has_no_witness_is_named(penalty):
    message = f"^penalty must be one of lasso, two-level, sorted-l1, not {penalty!r}$"
    with pytest.raises(ValueError, match=message):
        witness(penalty, 0.5, 0.3, 0.2)


@pytest.mark.parametrize("key", ["lasso", "two-level", "sorted-l1"])
def test_messages_of_the_witnesses(key):
    with pytest.raises(ValueError, match="^tpp must be .* above 0 and at most 1, not 0$"):
        witness(key, 0, 0.3, 0.2)
    with pytest.raises(ValueError, match="^sampling_ratio must be .* above 0, not nan$"):
        witness(key, 0.5, math.nan, 0.2)
    with pytest.raises(ValueError, match="^sparsity must be .* above 0 and below 1, not True$"):
        witness(key, 0.5, 0.3, True)
