"""The verdict: a sentence, with numbers, that answers what the trade-off plane shows."""

from dataclasses import dataclass

from app.reach import Reach
from app.words import computed, count, typed

__all__ = ["Piece", "plain", "verdict"]


@dataclass(frozen=True)
class Piece:
    """A stretch of the sentence: plain words, the user's `target`, a penalty's name,
    or a grey box for the digit still `pending`."""

    text: str
    kind: str = "words"  # "words", "target", "pending", or the key of a penalty


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
    pieces = [
        Piece(" is within reach of the "),
        _LASSO,
        Piece(", which for the best signal gets there from FDP "),
        *_value(reach, "lasso"),
        Piece(". "),
    ]
    if _open(reach):
        return [*pieces, _FOLLOW]
    if computed(reach.lowest["sorted-l1"]) == computed(reach.lowest["lasso"]):
        return [*pieces, Piece("No "), _SORTED_L1, Piece(" penalty gets lower.")]
    return [
        *pieces,
        Piece("Best "),
        _SORTED_L1,
        Piece(": "),
        *_value(reach, "sorted-l1"),
        _STOP,
    ]


def _beyond_lasso(reach: Reach) -> list[Piece]:
    goal = f"TPP {typed(reach.tpp)}"
    pieces = [Piece(" is out of reach of the "), _LASSO, *_why_not_lasso(reach)]
    if _open(reach):
        return [*pieces, _FOLLOW]
    two, best = _value(reach, "two-level"), _value(reach, "sorted-l1")
    if reach.reaches("two-level"):
        first, how = Piece("Two-level", "two-level"), f" reaches {goal} from FDP "
        return [*pieces, first, Piece(how), *two, _COMMA, _SORTED_L1, _FROM, *best, _STOP]
    if reach.reaches("sorted-l1"):
        first, how = Piece("Sorted L1", "sorted-l1"), f" reaches {goal} from FDP "
        only = Piece(" only from ")
        return [*pieces, first, Piece(how), *best, _COMMA, _TWO_LEVEL, only, *two, _STOP]
    first, how = Piece("Two-level", "two-level"), f" can reach {goal} only from FDP "
    return [*pieces, first, Piece(how), *two, _COMMA, _SORTED_L1, _FROM, *best, _STOP]


_COMMA, _STOP, _FROM = Piece(", "), Piece("."), Piece(" from ")
_FOLLOW = Piece("The values of two-level and sorted L1 follow.")


def _why_not_lasso(reach: Reach) -> list[Piece]:
    reason = " at any signal strength: "
    if reach.tpp >= reach.power_limit and reach.power_limit < 1.0:
        return [Piece(f"{reason}its power limit is {computed(reach.power_limit)}. ")]
    return [Piece(f"{reason}its FDP there is at least "), *_value(reach, "lasso"), Piece(". ")]


def _open(reach: Reach) -> bool:
    return any(reach.is_open(penalty) for penalty in reach.lowest)


def _value(reach: Reach, penalty: str) -> list[Piece]:
    """The lowest FDP: three digits, or two and a grey box while it is read off a curve."""
    value = reach.lowest[penalty]
    if reach.exact:
        return [Piece(computed(value))]
    return [Piece(computed(value, 2)), Piece("", "pending")]
