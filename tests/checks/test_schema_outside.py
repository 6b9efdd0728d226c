"""Our loaders against a general-purpose validator (the jsonschema library, draft 2020-12).

Whatever a loader takes, the schema admits. What the schema admits and the loader refuses is one
of the rules a schema cannot state:

- about several values: fewer actives than candidates, shares that sum to 1, levels that do not
  rise, weights that fall and count the candidates, a prediction within its penalty's limit;
- about the text: its size and encoding, a key given twice, whole characters, numbers beyond
  every float. (Files nested too deep, or with NaN, break the schema too: no value is so.)
"""

import copy
import json

import jsonschema
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.demo import DEMO_STUDY, demo_points
from engine.schemas import shortlist_schema, study_schema
from engine.shortlist import dump_shortlist, load_shortlist
from engine.study import load_study

STUDY = jsonschema.Draft202012Validator(study_schema())
SHORTLIST = jsonschema.Draft202012Validator(shortlist_schema())

# Words of the refusals that a schema cannot state.
BEYOND_SCHEMAS = (
    "must be smaller than candidates", "must have shares that sum to 1", "must not rise",
    "must be below the one before", "must count ", "predicted.fdp must be at least limits.",
)  # fmt: skip

values = st.one_of(
    st.none(), st.booleans(), st.text(max_size=5), st.integers(-3, 3000),
    st.floats(-2.0, 3000.0), st.just([]), st.just({}), st.sampled_from(["lasso", "two-level"]),
)  # fmt: skip


def places(node, path=()):
    """Every place in a JSON value at which something can be put."""
    yield path
    if isinstance(node, dict):
        for key, child in node.items():
            yield from places(child, (*path, key))
    elif isinstance(node, list):
        for i, child in enumerate(node[:3]):
            yield from places(child, (*path, i))


def put(data, path, value):
    if not path:
        return value
    data = copy.deepcopy(data)
    node = data
    for step in path[:-1]:
        node = node[step]
    node[path[-1]] = value
    return data


def refusal(load, data):
    """Why the loader refuses, or None."""
    try:
        load(json.dumps(data))
    except ValueError as error:
        return str(error)
    return None


def agree(validator, load, data):
    reason = refusal(load, data)
    if reason is None:
        validator.validate(data)
    elif not any(words in reason for words in BEYOND_SCHEMAS):
        assert not validator.is_valid(data), reason


def stricter(validator, load, data, words):
    """The schema admits, and the loader refuses with these words."""
    validator.validate(data)
    assert words in refusal(load, data)
    assert any(known in words for known in BEYOND_SCHEMAS)


GOOD_STUDY = DEMO_STUDY.to_dict()
GOOD_SHORTLIST = json.loads(dump_shortlist(demo_points()))


def test_the_schemas_are_schemas_and_admit_the_demo():
    for validator, data in ((STUDY, GOOD_STUDY), (SHORTLIST, GOOD_SHORTLIST)):
        validator.check_schema(validator.schema)
        validator.validate(data)


@settings(max_examples=300, deadline=None)
@given(st.sampled_from(list(places(GOOD_STUDY))), values)
def test_one_value_of_a_study_replaced(path, value):
    agree(STUDY, load_study, put(GOOD_STUDY, path, value))


@settings(max_examples=200, deadline=None)
@given(st.sampled_from(list(places(GOOD_SHORTLIST))), values)
def test_one_value_of_a_shortlist_replaced(path, value):
    agree(SHORTLIST, load_shortlist, put(GOOD_SHORTLIST, path, value))


effects = st.lists(
    st.one_of(
        st.fixed_dictionaries(
            {"size": st.sampled_from([0.2, -1, 0, "x"]), "share": st.sampled_from([0.5, 1, 0])}
        ),
        st.fixed_dictionaries(
            {
                "spread": st.sampled_from(["normal", "exponential", "cauchy"]),
                "scale": st.sampled_from([0.3, 0, -1]),
                "share": st.sampled_from([0.5, 1]),
            },
            optional={"size": st.just(1)},
        ),
    ),
    max_size=3,
)
fields = {
    "schema": st.sampled_from(["sparsereach/study/1"] * 3 + ["sparsereach/study/2"]),
    "runs": st.sampled_from([1, 600, 600.0, 10**9, 10**9 + 1, 0]),
    "candidates": st.sampled_from([2, 2000, 2000.5]),
    "actives": st.sampled_from([1, 1.0, 5]),
    "noise_sd": st.sampled_from([1, 1e-300, 0]),
    "effects": effects,
}
extras = {
    "title": st.sampled_from(["", "x" * 200, "\U0001f33f" * 200, "x" * 201, None]),
    "target": st.sampled_from([{"tpp": 1, "fdp": 0.5}, {"tpp": 1, "fdp": 1}, {"tpp": 0.5}, {}]),
    "note": st.just(""),
}


@settings(max_examples=300, deadline=None)
@given(st.fixed_dictionaries(fields, optional=extras))
def test_studies_with_several_things_wrong_or_none(data):
    agree(STUDY, load_study, data)


@pytest.mark.parametrize(
    ("validator", "load", "good", "path"),
    [
        pytest.param(validator, load, good, path, id=".".join(map(str, path)))
        for validator, load, good in (
            (STUDY, load_study, GOOD_STUDY),
            (SHORTLIST, load_shortlist, GOOD_SHORTLIST),
        )
        for path in places(good)
        if path and isinstance(path[-1], str) and path[:2] not in (("points", 0), ("points", 2))
    ],
)
def test_a_key_that_is_missing_or_misspelt(validator, load, good, path):
    data = copy.deepcopy(good)
    node = data
    for step in path[:-1]:
        node = node[step]
    value = node.pop(path[-1])
    if path[-1] not in ("title", "target"):
        assert not validator.is_valid(data)
    agree(validator, load, data)
    node[path[-1] + "x"] = value
    assert not validator.is_valid(data)
    agree(validator, load, data)


class TestStricterLoader:
    """Rules about several values: the loader holds them, a schema cannot."""

    def test_fewer_actives_than_candidates(self):
        words = "actives must be smaller than candidates (2000), not 2000"
        stricter(STUDY, load_study, put(GOOD_STUDY, ("actives",), 2000), words)
        inside = put(GOOD_SHORTLIST, ("points", 2, "study", "actives"), 2000)
        stricter(SHORTLIST, load_shortlist, inside, f"points[2].study.{words}")

    def test_shares_sum_to_one(self):
        off = put(GOOD_STUDY, ("effects", 0, "share"), 0.7)
        words = "effects must have shares that sum to 1, not 1.1"
        stricter(STUDY, load_study, off, words)
        off = put(GOOD_SHORTLIST, ("points", 2, "witness", "law", 0, "share"), 0.7)
        words = "points[2].witness.law must have shares that sum to 1, not 0.7"
        stricter(SHORTLIST, load_shortlist, off, words)

    def test_a_prediction_lies_within_the_limit_of_its_penalty(self):
        low = put(GOOD_SHORTLIST, ("points", 0, "predicted", "fdp"), 0.1)
        words = "points[0].predicted.fdp must be at least limits.lasso (0.45"
        stricter(SHORTLIST, load_shortlist, low, words)
        none = put(GOOD_SHORTLIST, ("points", 0, "limits", "lasso"), None)
        words = "points[0].predicted.fdp must be at least limits.lasso (null), not 0.45"
        stricter(SHORTLIST, load_shortlist, none, words)

    def test_levels_do_not_rise(self):
        rising = put(GOOD_SHORTLIST, ("points", 1, "penalty", "levels"), [1.0, 2.0])
        words = "points[1].penalty.levels must not rise, not [1.0, 2.0]"
        stricter(SHORTLIST, load_shortlist, rising, words)

    @pytest.mark.parametrize(
        ("pairs", "words"),
        [
            ([[1.0, 1000], [1.0, 1000]], "[1][0] must be below the one before, not 1"),
            ([[1.0, 1000], [2.0, 1000]], "[1][0] must be below the one before, not 2"),
            ([[2.0, 1000], [1.0, 999]], " must count 2000 candidates, not 1999"),
        ],
        ids=["level", "rising", "count"],
    )
    def test_weights_fall_and_count_the_candidates(self, pairs, words):
        data = put(GOOD_SHORTLIST, ("points", 0, "weights", "normalised"), pairs)
        stricter(SHORTLIST, load_shortlist, data, words)


class TestText:
    """Rules about the text, of which a validator sees nothing once it is parsed."""

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            (
                json.dumps(GOOD_STUDY).replace("{", '{"runs": 600, ', 1),
                "'runs' must be given once",
            ),
            (json.dumps(GOOD_STUDY) + " " * 1_000_000, "study file must be at most 1 MB"),
            (json.dumps(GOOD_STUDY).encode("utf-16"), "study file must be UTF-8"),
            (
                json.dumps({**GOOD_STUDY, "title": "\ud800"}),
                "title must be a text of whole characters",
            ),
            (
                json.dumps(GOOD_STUDY).replace('"noise_sd": 1.0', '"noise_sd": 1e400'),
                "noise_sd must be a finite number above 0, not inf",
            ),
            (
                json.dumps({**GOOD_STUDY, "noise_sd": 10**400}),
                "noise_sd must be a finite number above 0, not a number of more than 60 digits",
            ),
        ],
        ids=["twice", "large", "encoding", "surrogate", "1e400", "long"],
    )
    def test_only_the_loader_sees(self, text, message):
        STUDY.validate(json.loads(text))
        with pytest.raises(ValueError, match=f"^{message}"):
            load_study(text)

    @pytest.mark.parametrize("word", ["NaN", "Infinity", "-Infinity"])
    def test_words_that_are_not_json(self, word):
        text = json.dumps(GOOD_STUDY).replace('"runs": 600', f'"runs": {word}')
        assert not STUDY.is_valid(json.loads(text))
        with pytest.raises(ValueError, match=f"^numbers must be finite, not {word}$"):
            load_study(text)

    def test_both_admit_a_byte_order_mark_and_whole_numbers_with_a_point(self):
        text = json.dumps({**GOOD_STUDY, "runs": 600.0})
        STUDY.validate(json.loads(text))
        assert load_study(b"\xef\xbb\xbf" + text.encode()) == DEMO_STUDY
