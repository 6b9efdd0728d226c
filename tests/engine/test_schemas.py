"""The schemas and demo files in assets/ are the ones the program makes."""

import json
from pathlib import Path

import pytest

from engine.demo import DEMO_STUDY, demo_points, write_demo
from engine.schemas import write_schemas
from engine.shortlist import load_shortlist
from engine.study import load_study

ASSETS = Path(__file__).parents[2] / "assets"


@pytest.mark.parametrize("name", ["study.schema.json", "shortlist.schema.json"])
def test_schemas_are_up_to_date(tmp_path, name):
    write_schemas(tmp_path)
    assert (ASSETS / name).read_text(encoding="utf-8") == (tmp_path / name).read_text("utf-8")


def test_the_demo_study_is_up_to_date(tmp_path):
    write_demo(tmp_path)
    assert (ASSETS / "demo-study.json").read_text() == (
        tmp_path / "demo-study.json"
    ).read_text()
    assert load_study((ASSETS / "demo-study.json").read_bytes()) == DEMO_STUDY


def alike(one, other):
    """Equal, but for the last digits that another machine's mathematics may differ in."""
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(alike(one[k], other[k]) for k in one)
    if isinstance(one, list):
        return len(one) == len(other) and all(map(alike, one, other))
    if isinstance(one, float):
        return one == pytest.approx(other, rel=1e-5, abs=1e-9)
    return one == other


def test_the_demo_shortlist_is_up_to_date():
    kept = load_shortlist((ASSETS / "demo-shortlist.json").read_bytes())
    made = demo_points()
    assert len(kept) == len(made)
    for one, other in zip(kept, made, strict=True):
        # Runs of equal rounded weights may break elsewhere: compare the rest.
        left, right = (json.loads(json.dumps(point.data)) for point in (one, other))
        weights = [data.pop("weights")["normalised"] for data in (left, right)]
        assert alike(left, right)
        assert weights[0][0][0] == pytest.approx(weights[1][0][0], rel=1e-4)
