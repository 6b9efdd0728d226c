"""The session without a browser: all or nothing, and every verb."""

import base64

import pytest

from app.reach import exact, stand_in
from app.ready import ready_atlas, ready_contours
from app.state import Problem, Session
from engine.demo import DEMO_STUDY
from engine.study import Spread


def at_once(target, done):
    done(*exact(target))


def never(target, done):
    pass


@pytest.fixture
def session():
    session = Session(evaluate=at_once)
    session.open_study(DEMO_STUDY)
    return session


def upload(content: bytes) -> dict:
    text = base64.b64encode(content).decode()
    return {"name": "file.json", "size": len(content), "content": text}


def test_a_new_session_has_no_study():
    session = Session(evaluate=never)
    assert session.study() is None
    assert session.reach is None
    assert session.cannot_keep()


def test_opening_a_study_takes_all_of_it(session):
    assert session.study() == DEMO_STUDY
    assert session.reach.exact


def test_a_change_is_taken_once():
    session = Session(evaluate=never)
    session.open_study(DEMO_STUDY)
    seen = []
    session.param.watch(lambda *events: seen.append(events), ["runs", "reach", "curves"])
    session.propose({"runs": 700})
    assert len(seen) == 1
    assert session.reach.runs == 700


def test_a_bad_change_leaves_everything_as_it_was(session):
    before = session.study(), session.reach, session.curves
    session.propose({"runs": 700, "actives": "2000"})
    assert session.problem.message == "actives must be smaller than candidates (2000), not 2000"
    assert (session.study(), session.reach, session.curves) == before
    session.propose({"runs": 700})
    assert session.problem is None


def test_the_problem_names_the_field_it_was_made_in(session):
    session.propose({"sparsity": "1"})
    message = "sparsity must be a finite number above 0 and below 1, not 1"
    assert session.problem == Problem("sparsity", message)


@pytest.mark.parametrize("text", ["1 000", "1\u202f000", "1\u00a0000", " 1000 "])
def test_groups_may_be_typed(session, text):
    session.propose({"runs": text})
    assert session.runs == 1000


def test_ratios_become_counts(session):
    session.propose({"sampling_ratio": "0.3337"})
    assert session.runs == 667
    session.propose({"sparsity": 0.00001})
    assert session.actives == 1


def test_a_ratio_needs_candidates():
    session = Session(evaluate=never)
    session.propose({"sampling_ratio": 0.3})
    assert session.problem.message == "sampling_ratio needs candidates first"


def test_new_candidates_keep_counts_or_ratios(session):
    session.propose({"candidates": 4000})
    assert (session.runs, session.actives) == (600, 400)
    session.keep_counts(False)
    session.propose({"candidates": 1000})
    assert (session.runs, session.actives) == (150, 100)


def test_a_late_answer_is_dropped_with_its_study():
    answers = []
    session = Session(evaluate=lambda target, done: answers.append((target, done)))
    session.open_study(DEMO_STUDY)
    assert not session.reach.exact
    target, done = answers[0]
    done(*exact(target))
    assert session.reach.exact
    assert session.curves.exact


def test_the_target_alone_keeps_exact_curves(session):
    curves = session.curves
    session.propose({"tpp": 0.6})
    assert session.curves is curves


def test_points_are_kept_for_the_penalty_chosen(session):
    for penalty in ("sorted-l1", "two-level"):
        session.keep_as(penalty)
        session.keep_point()
    assert [point.penalty for point in session.kept.points] == ["sorted-l1", "two-level"]


def test_what_has_no_point_is_not_kept(session):
    session.keep_as("lasso")
    session.keep_point()
    assert session.kept.points == ()
    assert session.cannot_keep() == "no lasso has TPP 0.80: its power limit is lower"
    session.keep_as("two-level-closed-form")  # a curve, not a penalty
    session.keep_as("no such penalty")
    session.when_out("no such word")
    assert (session.kept_as, session.keeping) == ("lasso", "tpp")


@pytest.mark.parametrize("keeping", ["fdp", "nearest"])
def test_a_target_out_of_reach_is_kept_at_a_point_of_the_boundary(session, keeping):
    session.keep_as("lasso")
    session.when_out(keeping)
    session.propose({"fdp": 0.4})
    assert not session.cannot_keep()
    session.keep_point()
    (point,) = session.kept.points
    assert point.tpp < session.reach.power_limit
    if keeping == "fdp":
        assert point.fdp == pytest.approx(0.4, abs=1e-4)
    preview = stand_in(session.curves, "lasso", 0.8, 0.4, keeping)
    assert preview == pytest.approx((point.tpp, point.fdp), abs=0.02)  # a node of the curves


def test_a_kept_point_brings_its_study_back(session):
    session.keep_as("two-level")
    session.keep_point()
    session.keep_as("lasso")
    session.propose({"runs": 700, "tpp": 0.3, "fdp": 0.1})
    session.open_point(0)
    assert session.study() == DEMO_STUDY
    assert session.kept_as == "two-level"
    session.open_point(5)
    assert session.study() == DEMO_STUDY


def test_import_is_all_or_nothing_and_knows_what_it_has(session):
    session.keep_as("sorted-l1")
    session.keep_point()
    text = session.kept.exported().encode()
    session.import_points(upload(text))
    assert session.kept.notice == "0 added, 1 already there."
    session.import_points(upload(text.replace(b'"tpp": 0.8', b'"tpp": 1.8')))
    assert len(session.kept.points) == 1
    assert session.problem.message.startswith("file.json: points[0].study.target.tpp must be")


def test_needs_follow_the_target_and_siblings_the_study():
    session = Session(never, ready_atlas(), ready_contours())
    session.open_study(DEMO_STUDY)
    needs, siblings = session.needs, session.siblings
    session.propose({"runs": 700})
    assert session.needs is needs
    assert session.siblings is not siblings
    siblings = session.siblings
    session.propose({"tpp": 0.5})
    assert session.needs is not needs
    assert session.siblings is siblings


def test_an_upload_too_large_arrives_without_content(session):
    session.open_file({"name": "big.json", "size": 50_000_000, "content": ""})
    assert session.problem.message == "big.json: study file must be at most 1 MB, not 50 MB"


def test_titles_are_cut_not_refused(session):
    session.rename_study("x" * 300)
    assert len(session.study().title) == 200


def test_what_is_hatched_is_a_penalty(session):
    session.hatch("two-level-closed-form")
    session.hatch("no such penalty")
    assert session.hatched == "two-level-closed-form"


def test_a_spread_may_be_believed(session):
    session.believe([{"spread": "normal", "scale": "0.3", "share": 1.0}])
    assert session.problem is None
    assert session.study().effects == (Spread("normal", 0.3, 1.0),)
    session.believe([{"size": "0", "share": 1.0}])
    assert session.problem.field == "effects"
    assert session.study().effects == (Spread("normal", 0.3, 1.0),)
