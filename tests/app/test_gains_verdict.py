"""The sentence of the Signal page."""

from functools import lru_cache

from app.gains_verdict import best_of, gains_verdict
from app.outlook import COMPARED, outlook
from app.verdict import plain
from engine.study import Effect, Study

SPARSE = Study("Blends", 600, 2000, 100, 1.0, (Effect(0.2, 1.0),))
DENSE = Study("Blends", 600, 2000, 400, 1.0, (Effect(0.25, 1.0),))


@lru_cache
def looked(study, fdp):
    return {family: outlook(family, (study, fdp))[0] for family in COMPARED}


def test_where_the_lasso_is_as_good_it_says_so():
    """In sparse studies the cut matters more than the penalty."""
    text = plain(gains_verdict(0.2, looked(SPARSE, 0.2), done=True))
    assert text.startswith("At FDP 0.20 the plain lasso, debiased and cut, finds 0.602 of the")
    assert text.endswith("no real gain.")


def test_where_another_penalty_finds_more_it_says_how_much():
    text = plain(gains_verdict(0.5, looked(DENSE, 0.5), done=True))
    assert text.startswith("At FDP 0.50 the designed, debiased and cut, finds 0.425 of the")
    assert "the plain lasso, debiased and cut finds 0.333" in text


def test_the_best_is_the_largest_of_both_rules():
    outlooks = looked(DENSE, 0.5)
    family, rule = best_of(outlooks)
    best = outlooks[family].points[rule].tpp
    for each in outlooks.values():
        for other in ("nonzero", "two-stage"):
            assert not each.points[other].tpp > best


def test_before_any_answer():
    assert plain(gains_verdict(0.2, {}, done=False)) == (
        "At FDP 0.20: the answers are being computed."
    )
