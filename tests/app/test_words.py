"""Numbers as the screen shows them."""

import math

import pytest

from app.words import computed, count, ratio, significant, typed


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0, "0"),
        (999, "999"),
        (1000, "1\u202f000"),
        (1234567.4, "1\u202f234\u202f567"),
        (-12, "−12"),
    ],
)
def test_counts_are_grouped(value, text):
    assert count(value) == text


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [
        (0.7194889, 3, "0.719"),
        (0.7194889, 2, "0.72"),
        (0.0, 3, "0.000"),
        (1.0, 3, "1.000"),
        (1e-9, 3, "<0.001"),
        (0.9999, 3, ">0.999"),
        (0.999, 2, ">0.99"),
        (math.nan, 3, "none"),
    ],
)
def test_computed_shares_never_show_a_false_0_or_1(value, digits, text):
    assert computed(value, digits) == text


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.8, "0.80"), (0.75, "0.75"), (0.751, "0.751"), (1.0, "1.00"), (0.05, "0.05")],
)
def test_typed_shares_keep_two_digits_or_what_was_typed(value, text):
    assert typed(value) == text


def test_a_share_typed_with_many_digits_is_rounded():
    assert typed(0.123456) == "0.1235"


@pytest.mark.parametrize(
    ("value", "text"), [(0.3, "0.300"), (1.25, "1.250"), (0.0005, "0.000500")]
)
def test_ratios(value, text):
    assert ratio(value) == text


@pytest.mark.parametrize(
    ("value", "text"),
    [(1.2345, "1.23"), (12.345, "12.3"), (0.012345, "0.0123"), (1e-7, "1.00e-07")],
)
def test_three_significant_digits(value, text):
    assert significant(value) == text
