"""The Signal page asks when it is open, and knows which answers are of the present study."""

from functools import partial

from app.looking import Looking
from app.outlook import COMPARED, comparators, outlook
from app.state import Session
from engine.demo import DEMO_STUDY


def never(asked, done):
    pass


def pages(asked):
    """A looking whose questions are kept in `asked` until they are answered by hand."""

    def ask(key, question, done):
        asked[key] = (question, done)

    session = Session(evaluate=never)
    session.open_study(DEMO_STUDY)
    keys = (*COMPARED, "comparators")
    return session, Looking(session, {key: partial(ask, key) for key in keys})


def answer(asked, key):
    question, done = asked[key]
    work = comparators if key == "comparators" else partial(outlook, key)
    done(*work(question))


def test_a_closed_page_asks_nothing():
    asked = {}
    session, looking = pages(asked)
    session.propose({"runs": 700})
    assert asked == {}
    looking.open(True)
    assert set(asked) == {*COMPARED, "comparators"}
    assert asked["lasso"][0] == (session.study(), session.fdp)


def test_answers_come_in_one_by_one():
    asked = {}
    _, looking = pages(asked)
    looking.open(True)
    assert looking.waiting
    for key in list(asked):
        assert looking.waiting
        answer(asked, key)
    assert not looking.waiting


def test_an_answer_for_another_study_is_not_current():
    asked = {}
    session, looking = pages(asked)
    looking.open(True)
    answer(asked, "lasso")
    assert looking.is_current(looking.outlooks["lasso"])
    session.propose({"noise_sd": "2"})
    assert not looking.is_current(looking.outlooks["lasso"])
    assert looking.waiting


def test_the_tpp_wanted_is_not_asked_about():
    asked = {}
    session, looking = pages(asked)
    looking.open(True)
    asked.clear()
    session.propose({"runs": session.runs})  # nothing new
    assert asked == {}
