"""Our loaders against a general-purpose validator (the jsonschema library).

Whatever a loader takes, the schema admits. What the schema admits and the loader refuses is one
of the rules a schema cannot state: fewer actives than candidates, shares that sum to 1, levels
and weights that do not rise and count the candidates.
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
BEYOND_SCHEMAS = ("smaller than candidates", "sum to 1", "below the one before", "must count",
                  "must not rise")  # fmt: skip

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


GOOD_STUDY = DEMO_STUDY.to_dict()
GOOD_SHORTLIST = json.loads(dump_shortlist(demo_points()))


def test_the_schemas_are_schemas_and_admit_the_demo():
    for validator, data in ((STUDY, GOOD_STUDY), (SHORTLIST, GOOD_SHORTLIST)):
        validator.check_schema(validator.schema)
        validator.validate(data)


@settings(max_examples=300, deadline=None)
@given(st.sampled_from(list(places(GOOD_STUDY))), values)
def test_studies(path, value):
    agree(STUDY, load_study, put(GOOD_STUDY, path, value))


@settings(max_examples=300, deadline=None)
@given(st.sampled_from(list(places(GOOD_SHORTLIST))), values)
def test_shortlists(path, value):
    agree(SHORTLIST, load_shortlist, put(GOOD_SHORTLIST, path, value))


@pytest.mark.parametrize(
    "path", [p for p in places(GOOD_STUDY) if p and isinstance(p[-1], str)]
)
def test_a_key_that_is_missing_or_misspelt(path):
    data = put(GOOD_STUDY, path, None)
    node = data
    for step in path[:-1]:
        node = node[step]
    value = node.pop(path[-1])
    agree(STUDY, load_study, data)
    node[path[-1] + "x"] = value
    agree(STUDY, load_study, data)
