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

# Another platform's exp and erfc may differ in the last digit, and with it the point at which a
# search stops that meets the sampling ratio to 1e-8 of it: the FDP follows in proportion. The
# optimum is flat, so that law and weights follow only to the square root, some 1e-4.
SAME, FLAT = 1e-7, 1e-3
SHAPE = ("penalty", "strength", "witness")


def test_the_study_is_up_to_date(tmp_path):
    write_demo(tmp_path)
    made = (tmp_path / "demo-study.json").read_text("utf-8")
    assert (ASSETS / "demo-study.json").read_text("utf-8") == made
    assert load_study(made) == DEMO_STUDY


def test_the_shortlist_that_is_written_is_the_one_made(tmp_path):
    write_demo(tmp_path)
    assert load_shortlist((tmp_path / "demo-shortlist.json").read_bytes()) == MADE


def differences(one, other, slack, place=""):
    """The places at which two JSON values differ, numbers by more than a relative slack."""
    if isinstance(one, dict) and isinstance(other, dict) and list(one) == list(other):
        keys = ((one[key], other[key], slack, f"{place}.{key}") for key in one)
        return [found for key in keys for found in differences(*key)]
    if isinstance(one, list) and isinstance(other, list) and len(one) == len(other):
        entries = ((one[i], other[i], slack, f"{place}[{i}]") for i in range(len(one)))
        return [found for entry in entries for found in differences(*entry)]
    numbers = isinstance(one, float) and isinstance(other, float)
    same = one == (pytest.approx(other, rel=slack) if numbers else other)
    return [] if same else [f"{place}: {one!r}, {other!r}"]


def weights(point):
    values, counts = zip(*point.data["weights"]["normalised"], strict=True)
    return np.repeat(values, counts)


@pytest.mark.parametrize("index", range(len(MADE)))
def test_the_shortlist_is_up_to_date(index):
    kept, made = KEPT[index], MADE[index]
    assert len(KEPT) == len(MADE)
    assert kept.study == made.study == DEMO_STUDY
    assert list(kept.data) == list(made.data)
    for key in kept.data.keys() - {"weights"}:
        slack = FLAT if key in SHAPE else SAME
        assert differences(kept.data[key], made.data[key], slack, key) == []
    # Where one weight gives way to the next, a rank may fall on either side.
    gaps = np.abs(weights(kept) / weights(made) - 1.0)
    assert np.mean(gaps > FLAT) <= FLAT


def test_what_differs_is_told():
    assert differences({"a": [1.0, None]}, {"a": [1.0 + 1e-8, None]}, SAME) == []
    assert differences({"a": [1.0, 2.0]}, {"a": [1.001, 2.0]}, SAME) == [".a[0]: 1.0, 1.001"]
    assert differences({"a": [1.0, None]}, {"a": [1.0, 0.0]}, FLAT) == [".a[1]: None, 0.0"]
    assert differences({"a": 1}, {"b": 1}, FLAT) == [": {'a': 1}, {'b': 1}"]
    assert differences([1.0], [1.0, 1.0], FLAT) != []


def test_the_story():
    """A target beyond the lasso at any signal, and each point better than the last."""
    limit = power_limit(DEMO_STUDY.sampling_ratio, DEMO_STUDY.sparsity)
    lasso, two_level, sorted_l1 = MADE
    assert lasso.tpp < limit < two_level.tpp == sorted_l1.tpp < DEMO_STUDY.target.tpp
    assert sorted_l1.fdp < two_level.fdp <= DEMO_STUDY.target.fdp
    assert [point.penalty for point in MADE] == ["lasso", "two-level", "sorted-l1"]
    assert len({point.name for point in MADE}) == len(MADE)
