"""The study file: every rule, with the words it is refused in."""

import copy
import json

import pytest

from engine.study import Effect, Spread, Target, load_study, study_from

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
    assert study_from(changed(runs=600.0)).runs == 600


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
        (changed(title=3), "^title must be a text, not 3$"),
        (changed(title="x" * 201), "^title must be at most 200 characters, not 201$"),
    ],
)
def test_what_is_refused(data, message):
    with pytest.raises(ValueError, match=message):
        study_from(data)


def test_shares_may_be_off_by_rounding_only():
    thirds = [{"size": i + 1, "share": 1 / 3} for i in range(3)]
    assert len(study_from(changed(effects=thirds)).effects) == 3
    off = [{"size": 1, "share": 0.5}, {"size": 2, "share": 0.5 + 2e-9}]
    with pytest.raises(ValueError, match="sum to 1, not 1.000000002"):
        study_from(changed(effects=off))


def test_a_study_inside_a_larger_file_is_named_by_its_place():
    with pytest.raises(ValueError, match=r"^points\[2\]\.study\.runs must be"):
        study_from(changed(runs=0), "points[2].study")
