"""Links: what a query holds comes back, and a bad one breaks nothing."""

import json
from urllib.parse import parse_qsl

import pytest

from app.link import MOST_LINKED, open_link, query_of
from app.reach import exact
from app.state import Session
from engine.demo import DEMO_STUDY


def at_once(target, done):
    done(*exact(target))


@pytest.fixture
def session():
    session = Session(at_once)
    session.open_study(DEMO_STUDY)
    return session


def parts_of(session):
    return dict(parse_qsl(query_of(session), strict_parsing=True))


def reopened(parts):
    session = Session(at_once)
    open_link(session, parts)
    return session


def test_the_whole_view_comes_back(session):
    session.keep_point()
    session.kept.rename(0, name="Näme & Co = ?", note="a\nb")
    session.propose({"runs": 700, "fdp": 0.3})
    session.keep_as("two-level")
    session.keep_point()
    session.show("lasso", False)
    session.hatch("sorted-l1")
    session.when_out("nearest")
    session.keep_counts(False)
    session.turn_theme()
    back = reopened(parts_of(session))
    assert back.problem is None
    assert back.study() == session.study()
    assert back.kept.points == session.kept.points
    for name in ("shown", "hatched", "kept_as", "keeping", "keeps_counts", "theme"):
        assert getattr(back, name) == getattr(session, name)
    assert query_of(back) == query_of(session)


def test_a_window_without_a_study_has_a_link_too():
    session = Session(at_once)
    session.turn_theme()
    assert reopened(parts_of(session)).theme == "dark"


def test_an_empty_query_changes_nothing():
    session = reopened({})
    assert session.problem is None
    assert session.study() is None


def test_more_points_than_are_quickly_made_stay_out(session):
    session.keep_point()
    session.kept.points = session.kept.points * (MOST_LINKED + 1)
    assert "points" not in parts_of(session)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"runs": "1e99"}, "runs must be a whole number"),
        ({"runs": "many"}, "runs must be a whole number"),
        ({"actives": "2000"}, "actives must be smaller than candidates"),
        ({"tpp": "NaN"}, "target.tpp must be"),
        ({"noise_sd": ""}, "noise_sd must be"),
        ({"effects": "[" * 9999}, "effects must be JSON"),
        ({"effects": "[]"}, "effects must"),
        ({"points": "[1]"}, "points must hold objects"),
        ({"points": "{}"}, "points must be a list"),
        ({"points": json.dumps([{}] * 30)}, "points must be a list of at most"),
        ({"points": '[{"as": "lasso", "tpp": 0.9}]'}, "tpp must be below the power limit"),
        ({"points": '[{"as": "none", "tpp": 0.9}]'}, "penalty must be one of"),
        ({"points": '[{"as": "sorted-l1", "tpp": "x"}]'}, "tpp must be"),
        ({"points": '[{"as": "sorted-l1", "tpp": [1]}]'}, "tpp must be"),
        ({"title": "x" * 300}, "title must"),
    ],
)
def test_a_bad_link_says_what_is_wrong(session, changes, words):
    parts = parts_of(session) | changes
    back = reopened(parts)
    assert back.problem.message.startswith("link: ")
    assert words in back.problem.message
    assert back.study() is None
    assert back.kept.points == ()
