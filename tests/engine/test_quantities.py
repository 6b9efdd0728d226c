"""Each quantity's rule, in words and as a schema, is the one that is checked."""

import math
import re

import jsonschema
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.quantities import ACTIVES, EFFECT_SIZE, FDP, QUANTITIES, SPARSITY, TPP, shown


@pytest.mark.parametrize("quantity", QUANTITIES.values(), ids=QUANTITIES)
@given(value=st.one_of(st.floats(allow_nan=False, allow_infinity=False), st.integers(-5, 5)))
def test_check_and_schema_agree(quantity, value):
    validator = jsonschema.Draft202012Validator(quantity.schema())
    if validator.is_valid(value):
        assert quantity.check(value) == value
    else:
        with pytest.raises(
            ValueError, match=re.escape(f"{quantity.name} must be {quantity.rule}")
        ):
            quantity.check(value)


@pytest.mark.parametrize("quantity", QUANTITIES.values(), ids=QUANTITIES)
@pytest.mark.parametrize("value", [True, "1", None, [1], math.nan, math.inf, 10**400, 1j])
def test_wrong_kinds_are_refused(quantity, value):
    with pytest.raises(ValueError, match=f"^{quantity.name} must be"):
        quantity.check(value)


@pytest.mark.parametrize("quantity", QUANTITIES.values(), ids=QUANTITIES)
def test_sliders_explore_what_is_admitted(quantity):
    low, high = quantity.slider
    assert low < high
    if quantity.slider != (0.0, 1.0):
        assert quantity.admits(np.array([low, high])).all()
    assert quantity.scale in ("linear", "log", "cube root")


def test_rules_in_words():
    assert TPP.rule == "a finite number above 0 and at most 1"
    assert FDP.rule == "a finite number above 0 and below 1"
    assert ACTIVES.rule == "a whole number at least 1 and at most 1000000000"
    assert EFFECT_SIZE.rule == "a finite nonzero number"
    assert SPARSITY.option == "--sparsity"


def test_whole_numbers_come_back_as_integers():
    assert isinstance(ACTIVES.check(600.0), int)
    assert isinstance(ACTIVES.check(np.int64(600)), int)
    assert isinstance(TPP.check(1), float)


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.0, "0"), (2.0, "2"), (0.5, "0.5"), ("a" * 100, "'" + "a" * 56 + "...")],
)
def test_values_are_shown_short(value, text):
    assert shown(value) == text
