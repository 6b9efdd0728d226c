"""Operating points: what they hold, and that their file comes back as it was."""

import copy
import json
import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine import lasso_boundary, sorted_l1_boundary, two_level_boundary
from engine.demo import DEMO_STUDY, demo_points
from engine.files import SHORTLIST_BYTES
from engine.limits.families import witness
from engine.run_lengths import MOST_RUNS
from engine.shortlist import (
    MOST_POINTS,
    NAME_LENGTH,
    NOTE_LENGTH,
    Point,
    dump_shortlist,
    keep,
    load_shortlist,
)
from engine.study import MOST_EFFECTS, TITLE_LENGTH, Spread, study_from

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
    exact = witness("sorted-l1", 0.8, 0.3, 0.2).normalised_weights(2000)
    # Half a unit of the sixth digit.
    assert full == pytest.approx(exact, rel=5.1e-6)


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


@settings(max_examples=60, deadline=None)
@given(
    st.sampled_from(["lasso", "two-level", "sorted-l1"]),
    st.floats(0.001, 1.0),
    st.integers(2, 400),
    st.floats(0.01, 3.0),
    st.floats(0.001, 0.999),
)
def test_whatever_can_be_kept_comes_back_to_the_byte(penalty, tpp, candidates, ratio, sparsity):
    runs = max(1, round(ratio * candidates))
    actives = min(max(1, round(sparsity * candidates)), candidates - 1)
    study = replace(DEMO_STUDY, runs=runs, candidates=candidates, actives=actives)
    if penalty == "lasso" and math.isnan(
        lasso_boundary(tpp, study.sampling_ratio, study.sparsity)
    ):
        with pytest.raises(ValueError, match="^tpp must be below the power limit"):
            keep(study, penalty, tpp)
        return
    points = (keep(study, penalty, tpp, "Kept"),)
    text = dump_shortlist(points)
    assert load_shortlist(text) == points
    assert dump_shortlist(load_shortlist(text)) == text


def test_a_point_of_a_billion_candidates_is_kept_as_quickly():
    study = replace(DEMO_STUDY, runs=3 * 10**8, candidates=10**9, actives=2 * 10**8)
    pairs = keep(study, "sorted-l1", 0.8).data["weights"]["normalised"]
    # One weight for each would fill the memory.
    assert sum(count for _, count in pairs) == 10**9
    assert len(pairs) <= MOST_RUNS


def test_the_largest_shortlist_the_program_makes_can_be_read_again():
    """Every text as long as it may be and escaped, every number at its longest."""
    long = "\x01"  # six bytes in JSON
    effects = (Spread("exponential", 1.2345678901234567e-300, 1 / MOST_EFFECTS),) * MOST_EFFECTS
    study = replace(
        DEMO_STUDY,
        title=long * TITLE_LENGTH,
        runs=3 * 10**8,
        candidates=10**9,
        actives=2 * 10**8,
        effects=effects,
    )
    point = keep(study, "sorted-l1", 0.8, long * NAME_LENGTH, long * NOTE_LENGTH)
    count = 10**9 // MOST_RUNS
    pairs = [[float(f"{9.99999 - i / 1000:.5f}e-5"), count] for i in range(MOST_RUNS)]
    point = Point({**point.data, "weights": {"unit": "tau", "normalised": pairs}}, point.study)
    text = dump_shortlist((point,) * MOST_POINTS)
    assert len(text.encode()) <= SHORTLIST_BYTES
    assert study_from(point.data["study"]) == study
    assert load_shortlist(dump_shortlist((point,))) == (point,)


def test_no_points_are_a_shortlist():
    assert load_shortlist(dump_shortlist(())) == ()


def test_a_file_laid_out_otherwise_keeps_its_numbers_as_written():
    data = json.loads(TEXT)
    data["points"][0]["study"]["runs"] = 600.0
    (first, *_) = load_shortlist(json.dumps(data))
    assert first.study.runs == 600
    text = dump_shortlist((first,))
    assert '"runs": 600.0' in text
    assert dump_shortlist(load_shortlist(text)) == text


def two_level(levels, share=0.5):
    return {"family": "two-level", "levels": levels, "share": share}


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
        (
            lambda p: p["weights"]["normalised"].insert(0, p["weights"]["normalised"][0]),
            r"^points\[2\].weights.normalised\[1\]\[0\] must be below the one before, not ",
        ),
        (
            lambda p: p["weights"].update(normalised=[[1.0, 1999.5]]),
            r"normalised\[0\]\[1\] must be a whole number .*, not 1999.5$",
        ),
        (
            lambda p: p["weights"].update(normalised=[[1.0, 0]]),
            r"normalised\[0\]\[1\] must be .* at least 1 .*, not 0$",
        ),
        (
            lambda p: p["weights"].update(normalised=[[-1.0, 2000]]),
            r"normalised\[0\]\[0\] must be a finite number at least 0, not -1$",
        ),
        (
            lambda p: p["weights"].update(normalised=[[1.0, 1000, 1000]]),
            r"normalised\[0\] must have 2 to 2 entries, not 3$",
        ),
        (
            lambda p: p["weights"].update(normalised=[1.0]),
            r"normalised\[0\] must be a list, not 1$",
        ),
        (
            lambda p: p["weights"].update(normalised=[]),
            rf"weights.normalised must have 1 to {MOST_RUNS} entries, not 0$",
        ),
        (
            lambda p: p.update(weights=None),
            r"^points\[2\].weights must be an object, not None$",
        ),
        (lambda p: p.update(study=[]), r"^points\[2\].study must be an object, not \[\]$"),
        (
            lambda p: p["study"].update(runs=True),
            r"^points\[2\].study.runs must be .*, not True$",
        ),
        (
            lambda p: p["study"].update(schema="x"),
            r"^points\[2\].study.schema must be 'sparsereach/study/1', not 'x'$",
        ),
        (lambda p: p.update(name=None), r"^points\[2\].name must be a text, not None$"),
        (lambda p: p.update(name="x" * 121), r"name must be at most 120 characters, not 121$"),
        (
            lambda p: p.update(note="x" * 2001),
            r"note must be at most 2000 characters, not 2001$",
        ),
        (lambda p: p.update(version=1), r"^points\[2\].version must be a text, not 1$"),
        (
            lambda p: p["penalty"].update(family="two-level-closed-form"),
            r"penalty.family must be 'lasso' or 'two-level' or 'sorted-l1', not ",
        ),
        (
            lambda p: p.update(penalty={"family": "two-level"}),
            r"^points\[2\].penalty.levels must be given$",
        ),
        (
            lambda p: p.update(penalty=two_level([1, 2])),
            r"^points\[2\].penalty.levels must not rise, not \[1, 2\]$",
        ),
        (
            lambda p: p.update(penalty=two_level([2])),
            r"^points\[2\].penalty.levels must have 2 to 2 entries, not 1$",
        ),
        (
            lambda p: p.update(penalty=two_level([2, "low"])),
            r"^points\[2\].penalty.levels must be a finite number at least 0, not 'low'$",
        ),
        (
            lambda p: p.update(penalty=two_level([2, 1], 1.5)),
            r"^points\[2\].penalty.share must be .* at most 1, not 1.5$",
        ),
        (
            lambda p: p["strength"].update(zero_threshold=-1),
            r"strength.zero_threshold must be a finite number at least 0, not -1$",
        ),
        (
            lambda p: p["strength"].update(lambda_per_run=0),
            r"strength.lambda_per_run must be null, not 0$",
        ),
        (lambda p: p["strength"].pop("reason"), r"strength.reason must be given$"),
        (
            lambda p: p["strength"].update(lamdba=1),
            r"^points\[2\].strength.lamdba must be a known key; did you mean lambda\?$",
        ),
        (lambda p: p["predicted"].update(tpp=0), r"predicted.tpp must be .*, not 0$"),
        (lambda p: p["predicted"].update(fdp=1), r"predicted.fdp must be .* below 1, not 1$"),
        (
            lambda p: p["predicted"].update(fdp=0.64),
            r"^points\[2\].predicted.fdp must be at least limits.sorted_l1 \(0.640283.*\), "
            r"not 0.64$",
        ),
        (
            lambda p: p["penalty"].update(family="lasso"),
            r"^points\[2\].predicted.fdp must be at least limits.lasso \(null\), not 0.640",
        ),
        (lambda p: p["predicted"].update(fdp="0"), r"predicted.fdp must be .*, not '0'$"),
        (lambda p: p["limits"].update(two_level=False), r"two_level must be .*, not False$"),
        (
            lambda p: p["limits"].update(critical_sparsity=None),
            r"limits.critical_sparsity must be .*, not None$",
        ),
        (lambda p: p["limits"].pop("sorted_l1"), r"limits.sorted_l1 must be given$"),
        (lambda p: p["witness"].update(law=[]), r"law must have 1 to 3 entries, not 0$"),
        (
            lambda p: p["witness"]["law"][0].update(share=0),
            r"law\[0\].share must be .*, not 0$",
        ),
        (lambda p: p["witness"]["law"][0].update(size=0), r"law\[0\].size must be .*, not 0$"),
        (
            lambda p: p["witness"]["law"][0].update(share=0.9),
            r"^points\[2\].witness.law must have shares that sum to 1, not 0.9$",
        ),
        (lambda p: p["witness"].update(risk=-1), r"witness.risk must be .*, not -1$"),
        (lambda p: p["witness"].update(slope=1.1), r"witness.slope must be .*, not 1.1$"),
        (
            lambda p: p["witness"].update(reason=None),
            r"witness.reason must be a text, not None$",
        ),
        (lambda p: p["witness"].update(resolved=None), r"resolved must be true or false, not "),
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
    with pytest.raises(ValueError, match="^points must be given$"):
        load_shortlist('{"schema": "sparsereach/shortlist/1"}')
    with pytest.raises(ValueError, match="^schema must be given$"):
        load_shortlist('{"points": []}')
    with pytest.raises(ValueError, match="^points must be a list, not {}$"):
        load_shortlist('{"schema": "sparsereach/shortlist/1", "points": {}}')
    with pytest.raises(ValueError, match=r"^points\[0\] must be an object, not 3$"):
        load_shortlist('{"schema": "sparsereach/shortlist/1", "points": [3]}')
    with pytest.raises(
        ValueError, match="^shortlist file must be at most 15 MB, not 15.000001"
    ):
        load_shortlist(b" " * 15_000_001)
    with pytest.raises(ValueError, match="^'name' must be given once, not twice"):
        load_shortlist(TEXT.replace('"note":', '"name":', 1))
    many = json.dumps({"schema": "sparsereach/shortlist/1", "points": [{}] * (MOST_POINTS + 1)})
    with pytest.raises(ValueError, match="points must have 0 to 200 entries, not 201"):
        load_shortlist(many)


def test_a_predicted_fdp_may_round_to_zero_though_no_target_may():
    def round_off(point):
        point["predicted"]["fdp"] = point["limits"]["sorted_l1"] = 0

    assert load_shortlist(broken(round_off))[2].fdp == 0.0


def test_renaming_leaves_the_kept_point_alone():
    before = copy.deepcopy(POINTS[0].data)
    POINTS[0].renamed("Other", "why")
    assert POINTS[0].data == before
