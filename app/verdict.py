"""The verdict: a sentence, with numbers, that answers what the trade-off plane shows."""

from dataclasses import dataclass

from app.reach import Reach
from app.words import computed, count, typed

__all__ = ["Piece", "plain", "verdict"]


@dataclass(frozen=True)
class Piece:
    """A stretch of the sentence: plain words, the user's `target`, or a penalty's name."""

    text: str
    kind: str = "words"  # "words", "target", or the key of a penalty


_LASSO = Piece("lasso", "lasso")
_TWO_LEVEL = Piece("two-level", "two-level")
_SORTED_L1 = Piece("sorted L1", "sorted-l1")


def plain(pieces: list[Piece]) -> str:
    """Return the sentence as plain text."""
    return "".join(piece.text for piece in pieces)


def verdict(reach: Reach) -> list[Piece]:
    """Return the verdict on the target."""
    target = Piece(f"TPP {typed(reach.tpp)} at FDP {typed(reach.fdp)}", "target")
    if reach.fdp >= reach.random_fdp:
        return [target, *_trivial(reach)]
    if reach.reaches("lasso"):
        return [target, *_within_lasso(reach)]
    return [target, *_beyond_lasso(reach)]


def _trivial(reach: Reach) -> list[Piece]:
    return [
        Piece(
            " needs no study: picking at random already gives FDP "
            f"{computed(reach.random_fdp)}, for {count(reach.actives)} actives among "
            f"{count(reach.candidates)} candidates."
        )
    ]


def _within_lasso(reach: Reach) -> list[Piece]:
    lowest = reach.lowest
    pieces = [
        Piece(" is within reach of the "),
        _LASSO,
        Piece(f", which for the best signal gets there from FDP {computed(lowest['lasso'])}. "),
    ]
    if computed(lowest["sorted-l1"]) == computed(lowest["lasso"]):
        return [*pieces, Piece("No "), _SORTED_L1, Piece(" penalty gets lower.")]
    return [*pieces, Piece("Best "), _SORTED_L1, Piece(f": {computed(lowest['sorted-l1'])}.")]


def _beyond_lasso(reach: Reach) -> list[Piece]:
    two, best = reach.lowest["two-level"], reach.lowest["sorted-l1"]
    goal = f"TPP {typed(reach.tpp)}"
    pieces = [Piece(" is out of reach of the "), _LASSO, Piece(_why_not_lasso(reach))]
    if reach.reaches("two-level"):
        return [
            *pieces, Piece("Two-level", "two-level"),
            Piece(f" reaches {goal} from FDP {computed(two)}, "),
            _SORTED_L1, Piece(f" from {computed(best)}."),
        ]  # fmt: skip
    if reach.reaches("sorted-l1"):
        return [
            *pieces, Piece("Sorted L1", "sorted-l1"),
            Piece(f" reaches {goal} from FDP {computed(best)}, "),
            _TWO_LEVEL, Piece(f" only from {computed(two)}."),
        ]  # fmt: skip
    return [
        *pieces, Piece("Two-level", "two-level"),
        Piece(f" can reach {goal} only from FDP {computed(two)}, "),
        _SORTED_L1, Piece(f" from {computed(best)}."),
    ]  # fmt: skip


def _why_not_lasso(reach: Reach) -> str:
    reason = " at any signal strength: "
    if reach.tpp >= reach.power_limit and reach.power_limit < 1.0:
        return f"{reason}its power limit is {computed(reach.power_limit)}. "
    at_least = computed(reach.lowest["lasso"])
    return f"{reason}its FDP there is at least {at_least}. "
