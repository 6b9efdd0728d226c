"""The schemas in assets/ are the ones made from the quantities, and say what they can."""

import json
from pathlib import Path

import pytest

from engine.limits.families import FAMILIES
from engine.quantities import ACTIVES, CANDIDATES, EFFECT_SIZE, FDP, NOISE_SD, RUNS, TPP
from engine.schemas import shortlist_schema, study_schema, write_schemas
from engine.shortlist import LIMIT_KEYS
from engine.study import STUDY_SCHEMA

ASSETS = Path(__file__).parents[2] / "assets"


@pytest.mark.parametrize("name", ["study.schema.json", "shortlist.schema.json"])
def test_schemas_are_up_to_date(tmp_path, name):
    write_schemas(tmp_path)
    assert (ASSETS / name).read_text("utf-8") == (tmp_path / name).read_text("utf-8")


@pytest.mark.parametrize(
    ("name", "schema"),
    [("study", study_schema()), ("shortlist", shortlist_schema())],
    ids=["study", "shortlist"],
)
def test_the_files_hold_the_schemas(name, schema):
    kept = json.loads((ASSETS / f"{name}.schema.json").read_text("utf-8"))
    assert kept == schema
    assert kept["$schema"] == "https://json-schema.org/draft/2020-12/schema"


def test_the_rules_of_the_study_are_those_of_its_quantities():
    properties = study_schema()["properties"]
    for quantity in (RUNS, CANDIDATES, ACTIVES, NOISE_SD):
        assert properties[quantity.name] == quantity.schema()
    size, _ = properties["effects"]["items"]["oneOf"]
    assert size["properties"]["size"] == EFFECT_SIZE.schema()
    target = properties["target"]["properties"]
    assert target == {"tpp": TPP.schema(), "fdp": FDP.schema()}
    assert properties["schema"] == {"const": STUDY_SCHEMA}


def objects(schema):
    """Every schema of an object inside a schema."""
    if isinstance(schema, dict):
        if schema.get("type") == "object":
            yield schema
        for part in schema.values():
            yield from objects(part)
    elif isinstance(schema, list):
        for part in schema:
            yield from objects(part)


@pytest.mark.parametrize("make", [study_schema, shortlist_schema])
def test_every_object_states_its_keys_and_admits_no_others(make):
    found = list(objects(make()))
    assert len(found) >= 4
    for schema in found:
        assert schema["additionalProperties"] is False
        assert set(schema["required"]) <= set(schema["properties"])


def test_a_penalty_with_a_limit_has_its_place_in_a_point():
    point = shortlist_schema()["properties"]["points"]["items"]["properties"]
    assert set(LIMIT_KEYS) < set(point["limits"]["required"])
    single, two_level = point["penalty"]["oneOf"]
    families = [*single["properties"]["family"]["enum"]]
    families.append(two_level["properties"]["family"]["const"])
    assert set(families) == {key for key, family in FAMILIES.items() if family.witness}
