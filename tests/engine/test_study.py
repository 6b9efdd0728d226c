"""The study file: every rule, with the words it is refused in."""

import copy
import json
import math
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.study import (
    MOST_EFFECTS,
    SPREADS,
    Effect,
    Spread,
    Study,
    Target,
    check_actives,
    load_study,
    study_from,
)

GOOD = {
    "schema": "sparsereach/study/1",
    "title": "Blends",
    "runs": 600,
    "candidates": 2000,
    "actives": 100,
    "noise_sd": 1.0,
    "effects": [{"size": 0.2, "share": 1.0}],
    "target": {"tpp": 0.8, "fdp": 0.2},
}


def changed(**changes):
    return {**copy.deepcopy(GOOD), **changes}


def without(key):
    return {name: value for name, value in GOOD.items() if name != key}


def test_a_good_file():
    study = load_study(json.dumps(GOOD))
    assert (study.sampling_ratio, study.sparsity) == (0.3, 0.05)
    assert study.effects == (Effect(0.2, 1.0),)
    assert study.target == Target(0.8, 0.2)
    assert study_from(study.to_dict()) == study
    assert load_study(study.dumps()) == study


def test_title_and_target_may_be_left_out():
    study = study_from({k: v for k, v in GOOD.items() if k not in ("title", "target")})
    assert study.title == ""
    assert study.target is None
    assert "target" not in study.to_dict()


def test_spreads_and_negative_sizes():
    effects = [
        {"spread": "normal", "scale": 0.3, "share": 0.25},
        {"spread": "exponential", "scale": 0.1, "share": 0.25},
        {"size": -0.2, "share": 0.5},
    ]
    study = study_from(changed(effects=effects))
    assert study.effects[0] == Spread("normal", 0.3, 0.25)
    assert study.effects[2] == Effect(-0.2, 0.5)
    assert study.to_dict()["effects"] == effects


def test_a_whole_number_may_be_written_with_a_point():
    study = load_study(json.dumps(changed(runs=600.0, noise_sd=2)))
    assert type(study.runs) is int
    assert type(study.noise_sd) is float
    assert (study.runs, study.noise_sd) == (600, 2.0)


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (changed(schema="other/1"), "^schema must be 'sparsereach/study/1', not 'other/1'$"),
        (without("schema"), "^schema must be given$"),
        (without("runs"), "^runs must be given$"),
        (without("effects"), "^effects must be given$"),
        (changed(rusn=1), "^rusn must be a known key; did you mean runs"),
        (changed(runs=True), "^runs must be a whole number .*, not True$"),
        (changed(runs="600"), "^runs must be a whole number .*, not '600'$"),
        (changed(runs=600.5), "^runs must be a whole number .*, not 600.5$"),
        (changed(runs=0), "^runs must be a whole number at least 1 .*, not 0$"),
        (changed(runs=10**400), "not a number of more than 60 digits$"),
        (
            changed(actives=2000),
            r"^actives must be smaller than candidates \(2000\), not 2000$",
        ),
        (changed(noise_sd=0), "^noise_sd must be a finite number above 0, not 0$"),
        (changed(noise_sd=None), "^noise_sd must be a finite number above 0, not None$"),
        (changed(effects=[]), "^effects must have 1 to 100 entries, not 0$"),
        (changed(effects={}), "^effects must be a list, not {}$"),
        (changed(effects=[{"size": 0, "share": 1}]), r"^effects\[0\].size must be a .*nonzero"),
        (changed(effects=[{"size": 1, "share": 0.9}]), "shares that sum to 1, not 0.9$"),
        (changed(effects=[{"size": 1}]), r"^effects\[0\].share must be given$"),
        (
            changed(effects=[{"spread": "cauchy", "scale": 1, "share": 1}]),
            r"^effects\[0\].spread must be 'normal' or 'exponential', not 'cauchy'$",
        ),
        (
            changed(effects=[{"spread": "normal", "size": 1, "share": 1}]),
            r"^effects\[0\].size must be a known key",
        ),
        (changed(target={"tpp": 0.8}), "^target.fdp must be given$"),
        (changed(target={"tpp": 0, "fdp": 0.1}), "^target.tpp must be .* above 0 .*, not 0$"),
        (changed(target={"tpp": 1, "fdp": 1}), "^target.fdp must be .* below 1, not 1$"),
        ([GOOD], r"^file must be an object, not \[\{"),
        (changed(schema=None), "^schema must be 'sparsereach/study/1', not None$"),
        (changed(schema="sparsereach/study/2"), "not 'sparsereach/study/2'$"),
        (changed(candidates=10**9 + 1), "^candidates must be .*, not 1000000001$"),
        (changed(actives=-1), "^actives must be a whole number at least 1 .*, not -1$"),
        (
            changed(actives=2001),
            r"^actives must be smaller than candidates \(2000\), not 2001$",
        ),
        (changed(noise_sd="1"), "^noise_sd must be a finite number above 0, not '1'$"),
        (changed(noise_sd=math.inf), "^noise_sd must be a finite number above 0, not inf$"),
        (changed(noise_sd=True), "^noise_sd must be .*, not True$"),
        (changed(effects=[3]), r"^effects\[0\] must be an object, not 3$"),
        (changed(effects=[{"size": 1, "share": 0.01}] * 101), "1 to 100 entries, not 101$"),
        (changed(effects=[{"size": 1, "share": 0}]), r"^effects\[0\].share must be .*, not 0$"),
        (
            changed(effects=[{"size": 1, "share": 1}, {"size": "big", "share": 1}]),
            r"^effects\[1\].size must be a finite nonzero number, not 'big'$",
        ),
        (
            changed(effects=[{"size": 1, "share": 1, "spread": "normal"}]),
            r"^effects\[0\].size must be a known key; known are spread, scale, share$",
        ),
        (
            changed(effects=[{"siez": 1, "share": 1}]),
            r"^effects\[0\].siez must be a known key; did you mean size\?$",
        ),
        (
            changed(effects=[{"spread": "normal", "scale": -1, "share": 1}]),
            r"^effects\[0\].scale must be a finite number above 0, not -1$",
        ),
        (
            changed(effects=[{"spread": [], "scale": 1, "share": 1}]),
            r"^effects\[0\].spread must be 'normal' or 'exponential', not \[\]$",
        ),
        (changed(target=None), "^target must be an object, not None$"),
        (
            changed(target={"tpp": 0.8, "fdp": 0.1, "fdr": 0.1}),
            r"^target.fdr must be a known key; did you mean fdp\?$",
        ),
        (changed(title="\ud800"), "^title must be a text of whole characters, not '.ud800'$"),
        (changed(title=3), "^title must be a text, not 3$"),
        (changed(title="x" * 201), "^title must be at most 200 characters, not 201$"),
    ],
)
def test_what_is_refused(data, message):
    with pytest.raises(ValueError, match=message):
        study_from(data)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (json.dumps(GOOD).replace("0.2", "1e400", 1), r"^effects\[0\].size .*, not inf$"),
        (json.dumps(GOOD).replace("1.0", "NaN", 1), "^numbers must be finite, not NaN$"),
        (json.dumps(GOOD).replace("600", "9" * 600), "^numbers must have at most 500 digits"),
        (
            json.dumps(GOOD).replace("{", '{"runs": 1, ', 1),
            "^'runs' must be given once, not twice in one object$",
        ),
        (
            json.dumps(GOOD).replace('"fdp"', '"tpp"'),
            "^'tpp' must be given once, not twice in one object$",
        ),
        (
            json.dumps(changed(title="é"), ensure_ascii=False).encode("latin-1"),
            "^study file must be UTF-8, not other bytes",
        ),
        (json.dumps([GOOD]), r"^study file must be a JSON object, not \[\{"),
        (json.dumps(GOOD) + " " * 1_000_000, "^study file must be at most 1 MB, not 1.0001"),
        ('{"a": ' * 30 + "1" + "}" * 30, "^study file must be nested at most 20 deep$"),
    ],
)
def test_what_is_refused_in_a_file(content, message):
    with pytest.raises(ValueError, match=message):
        load_study(content)


def test_a_byte_order_mark_is_tolerated():
    assert load_study(b"\xef\xbb\xbf" + json.dumps(GOOD).encode()) == study_from(GOOD)


def test_the_most_effects_and_the_longest_title():
    even = [{"size": i + 1, "share": 1 / MOST_EFFECTS} for i in range(MOST_EFFECTS)]
    study = study_from(changed(effects=even, title="é" * 200))
    assert len(study.effects) == MOST_EFFECTS
    assert load_study(study.dumps().encode()) == study


def test_actives_are_fewer_than_the_candidates():
    check_actives(1, 2)
    message = r"^study\.actives must be smaller than candidates \(2\), not 2$"
    with pytest.raises(ValueError, match=message):
        check_actives(2, 2, "study.")


def test_shares_may_be_off_by_rounding_only():
    thirds = [{"size": i + 1, "share": 1 / 3} for i in range(3)]
    assert len(study_from(changed(effects=thirds)).effects) == 3
    off = [{"size": 1, "share": 0.5}, {"size": 2, "share": 0.5 + 2e-9}]
    with pytest.raises(ValueError, match="^effects must .* sum to 1, not 1.000000002$"):
        study_from(changed(effects=off))
    off[1]["share"] = 0.5 + 0.9e-9
    assert len(study_from(changed(effects=off)).effects) == 2


def test_a_study_inside_a_larger_file_is_named_by_its_place():
    for data, place in (
        (changed(runs=0), "runs"),
        (changed(actives=2000), "actives"),
        (changed(schema="x"), "schema"),
        (changed(extra=1), "extra"),
        (changed(effects=[{"size": 0, "share": 1}]), "effects[0].size"),
        (changed(target={"tpp": 2, "fdp": 0.1}), "target.tpp"),
        (without("candidates"), "candidates"),
    ):
        with pytest.raises(ValueError, match=f"^{re.escape(f'points[2].study.{place}')} must"):
            study_from(data, "points[2].study")
    with pytest.raises(ValueError, match=r"^points\[2\].study must be an object, not None$"):
        study_from(None, "points[2].study")


positive = st.floats(min_value=0.0, exclude_min=True, allow_infinity=False)
sizes = st.floats(allow_nan=False, allow_infinity=False).filter(bool)


@st.composite
def studies(draw):
    """Any study that the rules admit."""
    parts = draw(st.lists(st.integers(1, 1000), min_size=1, max_size=5))
    effects = [
        Effect(draw(sizes), part / sum(parts))
        if draw(st.booleans())
        else Spread(draw(st.sampled_from(SPREADS)), draw(positive), part / sum(parts))
        for part in parts
    ]
    candidates = draw(st.integers(2, 10**9))
    target = st.builds(
        Target,
        st.floats(0.0, 1.0, exclude_min=True),
        st.floats(0.0, 1.0, exclude_min=True, exclude_max=True),
    )
    return Study(
        title=draw(st.text(st.characters(exclude_categories=["Cs"]), max_size=200)),
        runs=draw(st.integers(1, 10**9)),
        candidates=candidates,
        actives=draw(st.integers(1, candidates - 1)),
        noise_sd=draw(positive),
        effects=tuple(effects),
        target=draw(st.none() | target),
    )


@settings(max_examples=200, deadline=None)
@given(studies())
def test_any_study_comes_back_and_its_file_to_the_byte(study):
    text = study.dumps()
    assert load_study(text) == study
    assert load_study(text.encode()).dumps() == text
    assert study_from(json.loads(json.dumps(study.to_dict()))) == study
    assert study.sampling_ratio == study.runs / study.candidates
    assert 0.0 < study.sparsity < 1.0
