"""The demo files in assets/ are the ones the program makes, and tell one story."""

from pathlib import Path

import numpy as np
import pytest

from engine import power_limit
from engine.demo import DEMO_STUDY, demo_points, write_demo
from engine.shortlist import load_shortlist
from engine.study import load_study

ASSETS = Path(__file__).parents[2] / "assets"
KEPT = load_shortlist((ASSETS / "demo-shortlist.json").read_bytes())
MADE = demo_points()

# Another platform's exp and erfc may differ in the last digit, and the roots found with them in
# the twelfth; a boundary's optimum is flat, so that its law and weights, unlike its FDP, follow
# only to the square root of that, near 1e-6.
FLAT = 1e-5


def test_the_study_is_up_to_date(tmp_path):
    write_demo(tmp_path)
    made = (tmp_path / "demo-study.json").read_text("utf-8")
    assert (ASSETS / "demo-study.json").read_text("utf-8") == made
    assert load_study(made) == DEMO_STUDY


def test_the_shortlist_that_is_written_is_the_one_made(tmp_path):
    write_demo(tmp_path)
    assert load_shortlist((tmp_path / "demo-shortlist.json").read_bytes()) == MADE


def differences(one, other, place=""):
    """The places at which two JSON values differ by more than the last digits of a number."""
    if isinstance(one, dict) and isinstance(other, dict) and list(one) == list(other):
        return [d for key in one for d in differences(one[key], other[key], f"{place}.{key}")]
    if isinstance(one, list) and isinstance(other, list) and len(one) == len(other):
        pairs = enumerate(zip(one, other, strict=True))
        return [d for i, pair in pairs for d in differences(*pair, f"{place}[{i}]")]
    numbers = isinstance(one, float) and isinstance(other, float)
    same = one == (pytest.approx(other, rel=FLAT) if numbers else other)
    return [] if same else [f"{place}: {one!r}, {other!r}"]


def weights(point):
    values, counts = zip(*point.data["weights"]["normalised"], strict=True)
    return np.repeat(values, counts)


@pytest.mark.parametrize("index", range(len(MADE)))
def test_the_shortlist_is_up_to_date(index):
    kept, made = KEPT[index], MADE[index]
    assert len(KEPT) == len(MADE)
    assert kept.study == made.study == DEMO_STUDY
    # Rounded weights may run together elsewhere: compare them rank by rank, the rest by key.
    rest = [
        {key: value for key, value in point.data.items() if key != "weights"}
        for point in (kept, made)
    ]
    assert differences(*rest) == []
    assert weights(kept) == pytest.approx(weights(made), rel=FLAT)


def test_what_differs_is_told():
    assert differences({"a": [1.0, None]}, {"a": [1.0 + 1e-7, None]}) == []
    assert differences({"a": [1.0, 2.0]}, {"a": [1.001, 2.0]}) == [".a[0]: 1.0, 1.001"]
    assert differences({"a": [1.0, None]}, {"a": [1.0, 0.0]}) == [".a[1]: None, 0.0"]
    assert differences({"a": 1}, {"b": 1}) == [": {'a': 1}, {'b': 1}"]
    assert differences([1.0], [1.0, 1.0]) != []


def test_the_story():
    """A target beyond the lasso at any signal, and each point better than the last."""
    limit = power_limit(DEMO_STUDY.sampling_ratio, DEMO_STUDY.sparsity)
    lasso, two_level, sorted_l1 = MADE
    assert lasso.tpp < limit < two_level.tpp == sorted_l1.tpp < DEMO_STUDY.target.tpp
    assert sorted_l1.fdp < two_level.fdp <= DEMO_STUDY.target.fdp
    assert [point.penalty for point in MADE] == ["lasso", "two-level", "sorted-l1"]
    assert len({point.name for point in MADE}) == len(MADE)
