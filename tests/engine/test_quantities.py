"""Each quantity's rule, in words and as a schema, is the one that is checked."""

import math
import re
from decimal import Decimal
from fractions import Fraction

import jsonschema
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import engine.quantities
from engine.quantities import (
    ACTIVES,
    CALIBRATION,
    EFFECT_SIZE,
    FDP,
    NOISE_SD,
    QUANTITIES,
    RUNS,
    SPARSITY,
    TPP,
    Quantity,
    shown,
)

DECLARED = {
    name: value
    for name, value in vars(engine.quantities).items()
    if isinstance(value, Quantity)
}
every_quantity = pytest.mark.parametrize("quantity", DECLARED.values(), ids=DECLARED)

numbers = st.one_of(
    st.floats(allow_nan=False, allow_infinity=False),
    st.floats(-0.5, 1.5),
    st.integers(-5, 5),
    st.integers(10**9 - 2, 10**9 + 2),
)


@every_quantity
@given(value=numbers)
def test_check_and_schema_agree(quantity, value):
    validator = jsonschema.Draft202012Validator(quantity.schema())
    if validator.is_valid(value):
        assert quantity.check(value) == value
    else:
        with pytest.raises(
            ValueError, match=re.escape(f"{quantity.name} must be {quantity.rule}")
        ):
            quantity.check(value)


@every_quantity
@pytest.mark.parametrize(
    "value",
    [
        True, np.True_, "1", b"1", None, [1], {}, math.nan, math.inf, -math.inf, 10**400, 1j,
        Decimal(1), Fraction(1), np.array(1), np.float32("nan"), np.longdouble("1e400"),
    ],
    ids=repr,
)  # fmt: skip
def test_wrong_kinds_are_refused(quantity, value):
    with pytest.raises(ValueError, match=re.escape(f"{quantity.name} must be {quantity.rule}")):
        quantity.check(value)


@every_quantity
def test_the_rule_in_words_is_the_rule_that_is_checked_at_the_ends(quantity):
    step = 1 if quantity.whole else 0
    for end, is_open, closed_word, open_word, outward in (
        (quantity.low, quantity.low_open, "at least", "above", -math.inf),
        (quantity.high, quantity.high_open, "at most", "below", math.inf),
    ):
        if math.isinf(end):
            assert closed_word not in quantity.rule
            continue
        assert f"{open_word if is_open else closed_word} {shown(end)}" in quantity.rule
        inside = end - math.copysign(step, outward) if step else math.nextafter(end, -outward)
        outside = end + math.copysign(step, outward) if step else math.nextafter(end, outward)
        admitted = quantity.admits(np.array([inside, end, outside]))
        assert admitted.tolist() == [True, not is_open, False]


def test_the_message_names_the_field_the_rule_and_the_value():
    message = "^tpp must be a finite number above 0 and at most 1, not 1.5$"
    with pytest.raises(ValueError, match=message):
        TPP.check(1.5)
    message = r"^points\[2\]\.study\.runs must be a whole number .* 1000000000, not '600'$"
    with pytest.raises(ValueError, match=message):
        RUNS.check("600", "points[2].study.runs")
    with pytest.raises(ValueError, match=r"^size must be a finite nonzero number, not 0$"):
        EFFECT_SIZE.check(-0.0)


def test_admits_answers_for_each_value():
    values = np.array([[-math.inf, -1.0, 0.0], [0.5, math.nan, 2.0]])
    assert CALIBRATION.admits(values).tolist() == [[False, False, True], [True, False, False]]
    assert RUNS.admits(values).tolist() == [[False, False, False], [False, False, True]]
    assert EFFECT_SIZE.admits(values).tolist() == [[False, True, False], [True, False, True]]


def test_schema_of_a_value():
    assert TPP.schema() == {
        "type": "number",
        "description": f"{TPP.meaning} (share of the actives)",
        "exclusiveMinimum": 0,
        "maximum": 1,
    }
    assert RUNS.schema() == {
        "type": "integer",
        "description": f"{RUNS.meaning} (count)",
        "minimum": 1,
        "maximum": 1000000000,
    }
    assert EFFECT_SIZE.schema()["not"] == {"const": 0}


def test_quantities_are_found_by_their_name():
    assert all(quantity.name == name for name, quantity in QUANTITIES.items())
    # Unique options and words: each is one slider, one option and one field.
    assert len({q.option for q in QUANTITIES.values()}) == len(QUANTITIES)
    assert len({q.label for q in QUANTITIES.values()}) == len(QUANTITIES)


@every_quantity
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
    assert NOISE_SD.rule == "a finite number above 0"
    assert SPARSITY.option == "--sparsity"
    assert NOISE_SD.option == "--noise-sd"


def test_whole_numbers_come_back_as_integers():
    assert isinstance(ACTIVES.check(600.0), int)
    assert type(ACTIVES.check(np.int64(600))) is int
    assert type(TPP.check(1)) is float
    assert type(TPP.check(np.float32(0.5))) is float


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"), (2.0, "2"), (0.5, "0.5"), (1e300, "1e+300"), (math.nan, "nan"),
        (math.inf, "inf"), (True, "True"), (None, "None"), (np.float64(0.25), "0.25"),
        (np.int64(3), "3"), (10**59, "1" + "0" * 59), ("two\nlines", r"'two\nlines'"),
        (-(10**60), "a number of more than 60 digits"), ("a" * 58, "'" + "a" * 58 + "'"),
        ("a" * 59, "'" + "a" * 56 + "..."), ("\ud800", r"'\ud800'"),
        (np.array([[1, 2], [3, 4]]), "array([[1, 2], [3, 4]])"),
    ],
)  # fmt: skip
def test_values_are_shown_short_and_on_one_line(value, text):
    assert shown(value) == text
