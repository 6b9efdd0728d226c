"""What the Signal page is told: the engine's predictions, fit to travel between processes."""

import pickle

import pytest

from app.outlook import COMPARED, RULES, comparators, outlook
from engine.prediction import curve, predict
from engine.study import Effect, Study

STUDY = Study("Blends", 600, 2000, 100, 1.0, (Effect(0.2, 1.0),))


@pytest.mark.parametrize("family", COMPARED)
def test_it_is_what_the_engine_predicts(family):
    (answer,) = pickle.loads(pickle.dumps(outlook(family, (STUDY, 0.2))))
    for rule in RULES:
        assert answer.points[rule].tpp == predict(STUDY, family, rule, fdp=0.2).tpp
    path = curve(STUDY, family, "two-stage")
    assert answer.curves["two-stage"][0].tolist() == path.tpp.tolist()


def test_comparators_travel_too():
    (answer,) = pickle.loads(pickle.dumps(comparators((STUDY, 0.2))))
    assert answer.screening.fdp == pytest.approx(0.2)
    assert answer.least_error.fdp > 0.5  # cross-validation does not aim at a short list
