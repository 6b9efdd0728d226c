"""The verdict says what the contract functions say, to the digits shown."""

import math

import pytest

from app.reach import exact_curves, exact_reach, swift_reach
from app.verdict import plain, verdict
from app.words import computed
from engine import lasso_boundary, power_limit, sorted_l1_boundary, two_level_boundary

STUDY = (600, 2000, 400)


def say(tpp: float, fdp: float) -> str:
    return plain(verdict(exact_reach((*STUDY, tpp, fdp))))


def test_beyond_the_power_limit_but_within_two_level():
    two, best = two_level_boundary(0.8, 0.3, 0.2), sorted_l1_boundary(0.8, 0.3, 0.2)
    assert say(0.8, 0.75) == (
        "TPP 0.80 at FDP 0.75 is out of reach of the lasso at any signal strength: its power "
        f"limit is {power_limit(0.3, 0.2):.3f}. Two-level reaches TPP 0.80 from FDP {two:.3f}, "
        f"sorted L1 from {best:.3f}."
    )


def test_between_sorted_l1_and_two_level():
    assert "Sorted L1 reaches TPP 0.80 from FDP 0.711, two-level only from 0.719" in say(
        0.8, 0.715
    )


def test_out_of_reach_of_all():
    assert "Two-level can reach TPP 0.80 only from FDP 0.719, sorted L1 from 0.711" in say(
        0.8, 0.3
    )


def test_above_the_boundary_of_the_lasso_though_below_its_power_limit():
    at_least = lasso_boundary(0.5, 0.3, 0.2)
    assert f"its FDP there is at least {at_least:.3f}." in say(0.5, 0.3)


def test_within_reach_of_the_lasso():
    text = say(0.4, 0.5)
    assert "is within reach of the lasso" in text
    assert f"from FDP {lasso_boundary(0.4, 0.3, 0.2):.3f}" in text
    assert f"Best sorted L1: {sorted_l1_boundary(0.4, 0.3, 0.2):.3f}" in text


def test_it_says_when_nothing_beats_the_lasso():
    reach = exact_reach((1900, 2000, 20, 0.5, 0.2))
    assert computed(reach.lowest["sorted-l1"]) == computed(reach.lowest["lasso"])
    assert "No sorted L1 penalty gets lower." in plain(verdict(reach))


@pytest.mark.parametrize("fdp", [0.8, 0.95])
def test_a_target_that_random_picks_meet_is_called_so(fdp):
    assert "picking at random already gives FDP 0.800" in say(0.3, fdp)


def test_what_is_not_known_yet_is_not_printed():
    reach = swift_reach((*STUDY, 0.8, 0.75))
    assert math.isnan(reach.lowest["sorted-l1"])
    assert plain(verdict(reach)).endswith("The values of two-level and sorted L1 follow.")


def test_what_is_read_off_a_curve_shows_two_digits_and_a_box():
    reach = swift_reach((*STUDY, 0.8, 0.75), exact_curves(0.3, 0.2))
    pieces = verdict(reach)
    assert [piece.kind for piece in pieces].count("pending") == 2
    assert "from FDP 0.72, sorted L1 from 0.71." in plain(pieces)
