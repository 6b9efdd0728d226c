"""Operating points: what they hold, and that their file comes back as it was."""

import copy
import json
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import lasso_boundary, sorted_l1_boundary, two_level_boundary
from engine.demo import DEMO_STUDY, demo_points
from engine.shortlist import MOST_POINTS, Point, dump_shortlist, keep, load_shortlist

POINTS = demo_points()
TEXT = dump_shortlist(POINTS)


@pytest.mark.parametrize(
    ("penalty", "boundary"),
    [
        ("lasso", lasso_boundary),
        ("two-level", two_level_boundary),
        ("sorted-l1", sorted_l1_boundary),
    ],
)
def test_a_point_holds_the_numbers_of_the_contract_functions(penalty, boundary):
    point = keep(DEMO_STUDY, penalty, 0.5)
    assert point.fdp == boundary(0.5, 0.3, 0.2)
    assert point.limit("two_level") == two_level_boundary(0.5, 0.3, 0.2)
    assert point.data["study"] == DEMO_STUDY.to_dict()
    assert point.data["strength"]["lambda"] is None
    assert point.data["strength"]["reason"]


def test_weights_are_run_length_pairs_that_fall():
    weights = keep(DEMO_STUDY, "sorted-l1", 0.8).data["weights"]["normalised"]
    values = [value for value, _ in weights]
    assert sum(count for _, count in weights) == DEMO_STUDY.candidates
    assert values == sorted(values, reverse=True)
    assert len(set(values)) == len(values)
    full = np.repeat(values, [count for _, count in weights])
    assert full.shape == (2000,)


def test_two_level_weights_are_its_levels():
    point = keep(DEMO_STUDY, "two-level", 0.8)
    penalty, weights = point.data["penalty"], point.data["weights"]["normalised"]
    # Weights are rounded to six digits.
    assert [value for value, _ in weights] == pytest.approx(penalty["levels"], rel=1e-5)
    assert weights[0][1] == pytest.approx(penalty["share"] * 2000, abs=1.0)


def test_a_limit_that_does_not_exist_is_null():
    point = keep(DEMO_STUDY, "sorted-l1", 0.8)
    assert point.data["limits"]["lasso"] is None
    assert math.isnan(point.limit("lasso"))


def test_what_cannot_be_kept():
    with pytest.raises(ValueError, match="tpp must be below the power limit"):
        keep(DEMO_STUDY, "lasso", 0.8)
    with pytest.raises(ValueError, match="penalty must be one of lasso, two-level, sorted-l1"):
        keep(DEMO_STUDY, "two-level-closed-form", 0.8)
    with pytest.raises(ValueError, match="name must be at most 120 characters, not 121"):
        keep(DEMO_STUDY, "sorted-l1", 0.8, "x" * 121)


def test_renamed():
    point = POINTS[0].renamed("Other", "why")
    assert (point.name, point.note, POINTS[0].note) == ("Other", "why", "")
    with pytest.raises(ValueError, match="note must be a text"):
        POINTS[0].renamed("Other", 3)


def test_the_file_comes_back_to_the_byte():
    assert dump_shortlist(load_shortlist(TEXT)) == TEXT
    assert load_shortlist(TEXT) == POINTS


@settings(max_examples=30, deadline=None)
@given(st.text(max_size=120), st.text(max_size=300), st.permutations(range(3)))
def test_any_names_notes_and_order_come_back_to_the_byte(name, note, order):
    points = tuple(POINTS[i].renamed(name, note) for i in order)
    text = dump_shortlist(points)
    assert dump_shortlist(load_shortlist(text.encode())) == text


def broken(change):
    data = json.loads(TEXT)
    change(data["points"][2])
    return json.dumps(data)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda p: p.pop("witness"), r"^points\[2\].witness must be given$"),
        (
            lambda p: p.update(pagee=1),
            r"^points\[2\].pagee must be a known key; did you mean page",
        ),
        (lambda p: p.update(page="runs"), r"^points\[2\].page must be 'reach', not 'runs'$"),
        (
            lambda p: p.update(selection=[]),
            r"^points\[2\].selection must be 'nonzero', not \[\]$",
        ),
        (
            lambda p: p["study"].update(actives=2000),
            r"^points\[2\].study.actives must be smaller",
        ),
        (lambda p: p["penalty"].update(family="ridge"), r"penalty.family must be 'lasso' or"),
        (lambda p: p["penalty"].update(levels=[2, 1]), r"penalty.levels must be a known key"),
        (
            lambda p: p["strength"].update({"lambda": 3}),
            r"strength.lambda must be null, not 3$",
        ),
        (
            lambda p: p["strength"].update(calibration=2),
            r"strength.calibration must be .*, not 2$",
        ),
        (lambda p: p["predicted"].update(tpp=True), r"predicted.tpp must be .*, not True$"),
        (lambda p: p["predicted"].update(fdp=False), r"predicted.fdp must be .*, not False$"),
        (lambda p: p.update(rehearsed={}), r"rehearsed must be null, not {}$"),
        (lambda p: p["limits"].update(power_limit=0), r"limits.power_limit must be .*, not 0$"),
        (lambda p: p["limits"].update(lasso=1.5), r"limits.lasso must be .*, not 1.5$"),
        (lambda p: p["witness"].update(attained=1), r"witness.attained must be true or false"),
        (
            lambda p: p["witness"]["law"][0].update(size="big"),
            r"law\[0\].size must be .*'big'$",
        ),
        (
            lambda p: p["weights"]["normalised"].append([0.0001, 1]),
            r"weights.normalised must count 2000 candidates, not 2001$",
        ),
        (
            lambda p: p["weights"]["normalised"].append([9, 1]),
            r"must be below the one before, not 9$",
        ),
        (lambda p: p["weights"].update(unit="sd"), r"weights.unit must be 'tau', not 'sd'$"),
    ],
)
def test_a_file_is_taken_whole_or_refused_at_its_first_fault(change, message):
    with pytest.raises(ValueError, match=message):
        load_shortlist(broken(change))


def test_files_of_another_kind():
    with pytest.raises(
        ValueError, match="schema must be 'sparsereach/shortlist/1', not 'spars"
    ):
        load_shortlist(DEMO_STUDY.dumps())
    many = json.dumps({"schema": "sparsereach/shortlist/1", "points": [{}] * (MOST_POINTS + 1)})
    with pytest.raises(ValueError, match="points must have 0 to 200 entries, not 201"):
        load_shortlist(many)


def test_points_do_not_share_what_they_hold():
    one = load_shortlist(TEXT)[0]
    other = Point(copy.deepcopy(one.data), one.study)
    assert one == other
