"""The shortlist of a window: every verb, taken back."""

import base64

import pytest

from app.kept import Kept, marks, point_letter
from engine.demo import DEMO_STUDY
from engine.shortlist import MOST_POINTS
from engine.study import Target


@pytest.fixture
def kept():
    kept = Kept()
    for tpp in (0.5, 0.6, 0.7):
        kept.add(DEMO_STUDY, "sorted-l1", tpp)
    return kept


def tpps(kept):
    return [point.tpp for point in kept.points]


def test_remove_and_undo(kept):
    kept.remove(0)
    assert tpps(kept) == [0.6, 0.7]
    kept.undo()
    assert tpps(kept) == [0.5, 0.6, 0.7]
    kept.undo()  # one step only
    assert tpps(kept) == [0.5, 0.6, 0.7]


def test_move_and_undo(kept):
    kept.move(2, -1)
    assert tpps(kept) == [0.5, 0.7, 0.6]
    assert kept.notice == "Sorted L1 at TPP 0.70 is now B."
    kept.undo()
    assert tpps(kept) == [0.5, 0.6, 0.7]


@pytest.mark.parametrize(
    "use",
    [
        lambda kept: kept.move(0, -1),
        lambda kept: kept.move(2, 1),
        lambda kept: kept.remove(3),
        lambda kept: kept.rename(-1, "x"),
    ],
)
def test_places_that_do_not_exist_change_nothing(kept, use):
    before = kept.points
    use(kept)
    assert kept.points is before


def test_names_and_notes_are_cut_to_what_the_file_holds(kept):
    kept.rename(1, name="  Wide net " + "x" * 300)
    kept.rename(1, note="n" * 3000)
    assert kept.points[1].name.startswith("Wide net")
    assert (len(kept.points[1].name), len(kept.points[1].note)) == (120, 2000)
    other = Kept()
    other.read({"name": "a", "size": 1, "content": _base64(kept.exported())})
    assert other.points == kept.points


def test_the_same_name_is_no_change(kept):
    kept.remove(2)
    kept.rename(0, name=kept.points[0].name)
    kept.undo()
    assert len(kept.points) == 3


def test_there_is_an_end(kept):
    kept.points = (kept.points * MOST_POINTS)[:MOST_POINTS]
    kept.add(DEMO_STUDY, "sorted-l1", 0.5)
    assert len(kept.points) == MOST_POINTS
    assert "at most 200" in kept.notice


def test_letters_go_on_after_z():
    assert [point_letter(i) for i in (0, 25, 26, 52)] == ["A", "Z", "A2", "A3"]


def test_a_stem_leads_to_a_target_that_was_not_reached():
    kept = Kept()
    here = (DEMO_STUDY.sampling_ratio, DEMO_STUDY.sparsity)
    for target in (Target(0.6, 0.9), Target(0.6, 0.3), Target(0.9, 0.3)):
        study = DEMO_STUDY.__class__(**{**vars(DEMO_STUDY), "target": target})
        kept.add(study, "sorted-l1", 0.6)
    first, second, third = marks(kept.points, here)
    assert (first.target_tpp, first.target_fdp) == (first.tpp, first.fdp)
    assert (second.target_tpp, second.target_fdp) == (0.6, 0.3)
    assert (third.target_tpp, third.target_fdp) == (0.9, 0.3)
    assert marks(kept.points, (0.4, 0.2)) == []


def _base64(text):

    return base64.b64encode(text.encode()).decode()
