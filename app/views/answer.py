"""Under the planes: the verdict, and keeping a point."""

from typing import Any

from markupsafe import Markup

from app.afterwards import Afterwards
from app.components.sheet import Sheet
from app.state import Session
from app.verdict import Piece, verdict
from app.words import short_name
from engine.limits.families import FAMILIES

__all__ = ["AnswerView"]

_KEEPING = {"tpp": "its TPP", "fdp": "its FDP", "nearest": "the nearest"}


class AnswerView:
    """The sentence and the Keep button of one session."""

    def __init__(self, session: Session, afterwards: Afterwards) -> None:
        self._session = session
        self.verdict = Sheet("verdict", self._use, live=True)
        self.keep = Sheet("keep", self._use)
        watch = session.param.watch
        later = afterwards.put_off
        watch(later(self._show_verdict), ["reach", "problem"])
        watch(later(self._show_keep), ["reach", "kept_as", "keeping", "problem"])
        watch(self._dim, ["problem"])
        self._show_verdict()
        self._show_keep()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        return {"verdict": self.verdict, "keep": self.keep}

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        match data.get("do"):
            case "keep":
                session.keep_point()
            case "keep-as":
                session.keep_as(str(data.get("penalty")))
            case "when-out":
                session.when_out(str(data.get("keeping")))
            case "example":
                session.open_example()

    def _show_verdict(self, *_: Any) -> None:
        self.verdict.html = _verdict_html(self._session)

    def _dim(self, *_: Any) -> None:
        """Show that the pictures stand for the last good study, not for what was typed."""
        self.verdict.ask("dim", on=self._session.problem is not None)

    def _show_keep(self, *_: Any) -> None:
        self.keep.html = _keep_html(self._session)


def _verdict_html(session: Session) -> Markup:
    if session.problem is not None:
        return Markup('<p class="problem">{}</p>').format(session.problem.message)
    if session.reach is None:
        return Markup(
            '<p>Type <span class="target">runs, candidates, actives</span>, or open the '
            'example study.</p><p><button class="button" data-do="example" data-key="example">'
            "Open the example</button></p>"
        )
    exact = str(session.reach.exact).lower()
    sentence = Markup("").join(map(_piece, verdict(session.reach)))
    return Markup('<p data-exact="{}">{}</p>').format(exact, sentence)


def _piece(piece: Piece) -> Markup:
    if piece.kind == "words":
        return Markup("{}").format(piece.text)
    if piece.kind == "pending":
        return Markup('<i class="pending" title="exact when the hand rests"></i>')
    if piece.kind == "target":
        return Markup('<span class="target">{}</span>').format(piece.text)
    return Markup('<span class="family {}">{}</span>').format(piece.kind, piece.text)


def _keep_html(session: Session) -> Markup:
    """The Keep button, the penalty it keeps, what a point out of reach keeps, the state."""
    refusal = session.cannot_keep()
    exact = session.reach is not None and session.reach.exact
    penalties = {key: short_name(key) for key, family in FAMILIES.items() if family.witness}
    return Markup(
        '<div class="keep-row"><button class="button strong" data-do="keep" data-key="keep" '
        "{disabled}>Keep this point <kbd>K</kbd></button>{state}</div>"
        '<div class="keep-row">as {penalties}</div>'
        '<div class="keep-row" title="Where the target is out of the penalty\'s reach, a point '
        'of its boundary is kept instead">if out of reach, keep {keeping}</div>{refusal}'
    ).format(
        disabled=Markup('disabled title="{}"').format(refusal) if refusal else "",
        penalties=_choice("Penalty to keep", "keep-as", "penalty", penalties, session.kept_as),
        keeping=_choice(
            "What a point out of reach keeps", "when-out", "keeping", _KEEPING, session.keeping
        ),
        state=_EXACT if exact else _WAITING,
        refusal=Markup('<p class="notice muted">{}</p>').format(refusal) if refusal else "",
    )


def _choice(label: str, do: str, field: str, words: dict[str, str], chosen: str) -> Markup:
    return Markup('<span class="segments" role="group" aria-label="{}">{}</span>').format(
        label,
        Markup("").join(
            Markup(
                '<button data-do="{0}" data-{1}="{2}" data-key="{0}-{2}" '
                'aria-pressed="{3}">{4}</button>'
            ).format(do, field, key, str(key == chosen).lower(), word)
            for key, word in words.items()
        ),
    )


_EXACT = Markup('<p class="state">exact values</p>')
_WAITING = Markup('<p class="state waiting">exact at rest</p>')
