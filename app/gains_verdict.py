"""The sentence on the Signal page: which penalty and rule find most, and by how much."""

from app.outlook import Outlook
from app.verdict import Piece
from app.words import computed, count, typed

__all__ = ["best_of", "gains_verdict"]

# Fewer than this share of the actives more is no gain that a study could show.
_NO_GAIN = 0.01

# The rule that keeps to the wanted FDP without a belief finds a little less by design, so the
# two that aim at the FDP itself are compared.
_AIMED = ("nonzero", "two-stage")

_HOW = {"nonzero": "", "two-stage": ", debiased and cut"}


def best_of(outlooks: dict[str, Outlook]) -> tuple[str, str] | None:
    """Family and rule of the largest TPP at the wanted FDP; None where none has a point."""
    points = {
        (family, rule): outlook.points[rule].tpp
        for family, outlook in outlooks.items()
        for rule in _AIMED
        if not outlook.points[rule].reason
    }
    return max(points, key=lambda pair: points[pair]) if points else None


def gains_verdict(fdp: float, outlooks: dict[str, Outlook], done: bool) -> list[Piece]:
    """Return the verdict on the families whose answers are in."""
    target = Piece(f"FDP {typed(fdp)}", "target")
    best = best_of(outlooks)
    if best is None:
        told = "no penalty has a point" if done else "the answers are being computed"
        return [Piece("At "), target, Piece(f": {told}.")]
    plain = _plain_best(outlooks)
    if plain is None:
        return [Piece("At "), target, Piece(" the "), *_found(outlooks, *best), Piece(".")]
    gain = outlooks[best[0]].points[best[1]].tpp - outlooks[plain[0]].points[plain[1]].tpp
    first = [Piece("At "), target, Piece(" the plain "), *_found(outlooks, *plain), Piece(". ")]
    if best == plain:
        return [*first, Piece("None of the others finds more." if done else "Others follow.")]
    family, rule = best
    tpp = computed(outlooks[family].points[rule].tpp)
    other = Piece(family, family)
    if gain < _NO_GAIN:
        return [*first, Piece("The best of the others, "), other, Piece(
            f"{_HOW[rule]}, reaches {tpp}: no real gain.")]  # fmt: skip
    return [
        Piece("At "), target, Piece(" the "), *_found(outlooks, *best), Piece("; the plain "),
        Piece("lasso", "lasso"),
        Piece(f"{_HOW[plain[1]]} finds {computed(outlooks['lasso'].points[plain[1]].tpp)}."),
    ]  # fmt: skip


def _plain_best(outlooks: dict[str, Outlook]) -> tuple[str, str] | None:
    return best_of({k: each for k, each in outlooks.items() if k == "lasso"})


def _found(outlooks: dict[str, Outlook], family: str, rule: str) -> list[Piece]:
    point = outlooks[family].points[rule]
    return [
        Piece(family, family),
        Piece(
            f"{_HOW[rule]}{',' if _HOW[rule] else ''} finds {computed(point.tpp)} of the "
            f"actives in a list of {count(point.list_size)}"
        ),
    ]
