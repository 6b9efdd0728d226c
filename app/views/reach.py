"""The Reach page: two planes, the names at the curves' ends, the verdict, and keeping."""

import math
from functools import partial
from typing import Any

import panel as pn
from markupsafe import Markup

from app.coalesce import Coalescer
from app.components.ends import Ends
from app.components.sheet import Sheet
from app.plots.phase import PhasePlane
from app.plots.tradeoff import TradeoffPlane
from app.reach import Reach
from app.state import Session
from app.theme import THEMES
from app.verdict import Piece, verdict
from app.words import NONE, computed, count, typed
from engine.limits.families import FAMILIES
from engine.quantities import FDP, SAMPLING_RATIO, SPARSITY, TPP, Quantity

__all__ = ["ReachView"]

# A hand on a plane of some 500 pixels moves in steps of thousandths.
_DRAG_DIGITS = 3

# Beside the other names of its column, the closed form needs no more.
_SHORT = {"two-level-closed-form": "closed form"}


class ReachView:
    """Pictures and words of one session's Reach page, built once."""

    def __init__(self, session: Session, inbox: Coalescer) -> None:
        self._session = session
        self._inbox = inbox
        self.tradeoff = TradeoffPlane()
        self.phase = PhasePlane()
        self.tradeoff.handle.follow(partial(self._drag, TPP, FDP), self._let_go)
        self.phase.handle.follow(partial(self._drag, SAMPLING_RATIO, SPARSITY), self._let_go)
        self.ends = Ends()
        self.verdict = Sheet("verdict", self._use, live=True)
        self.keep = Sheet("keep", self._use)
        watch = session.param.watch
        watch(self._show_curves, ["curves", "hatched", "shown"])
        watch(self._show_reach, ["reach", "problem"])
        watch(self._show_ends, ["reach", "shown"])
        watch(self._show_kept, ["points", "curves"])
        watch(self._show_keep, ["reach", "kept_as", "notice", "problem", "points"])
        watch(self._dim, ["problem"])
        watch(self._repaint, ["theme"])
        self._repaint()
        self._show_curves()
        self._show_reach()
        self._show_ends()
        self._show_kept()
        self._show_keep()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        return {
            "tradeoff": pn.pane.Bokeh(self.tradeoff.figure, sizing_mode="stretch_both"),
            "phase": pn.pane.Bokeh(self.phase.figure, sizing_mode="stretch_both"),
            "ends": self.ends,
            "verdict": self.verdict,
            "keep": self.keep,
        }

    def _drag(self, across: Quantity, up: Quantity, x: float, y: float) -> None:
        self._inbox.post(across.name, round(x, _DRAG_DIGITS))
        self._inbox.post(up.name, round(y, _DRAG_DIGITS))

    def _let_go(self) -> None:
        """Let the target rest on whole hundredths, and both handles where the session is."""
        session = self._session
        if session.reach is not None:
            self._inbox.post(TPP.name, max(round(session.tpp, 2), TPP.step))
            self._inbox.post(
                FDP.name, min(max(round(session.fdp, 2), FDP.step), 1.0 - FDP.step)
            )

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        match data.get("do"):
            case "keep":
                session.keep_point()
            case "keep-as":
                session.keep_as(str(data.get("penalty")))
            case "undo":
                session.undo()
            case "example":
                session.open_example()

    def _show_curves(self, *_: Any) -> None:
        session = self._session
        if session.curves is not None:
            self.tradeoff.show_curves(session.curves, session.shown, session.hatched)

    def _show_reach(self, *_: Any) -> None:
        session = self._session
        if session.reach is None:
            self.tradeoff.clear()
            self.phase.clear()
        elif session.problem is None:
            self.tradeoff.show_reach(session.reach)
            self.phase.show_reach(session.reach)
        self.verdict.html = _verdict_html(session)

    def _dim(self, *_: Any) -> None:
        """Show that the pictures stand for the last good study, not for what was typed."""
        self.verdict.ask("dim", on=self._session.problem is not None)

    def _show_ends(self, *_: Any) -> None:
        session = self._session
        reach = session.reach
        if reach is None:
            self.ends.param.update(heading="", rows=[], counts=[])
            return
        self.ends.param.update(
            heading=f"Lowest FDP\nat TPP {typed(reach.tpp)}",
            rows=_rows(reach, session.shown),
            counts=_counts(reach),
        )

    def _show_kept(self, *_: Any) -> None:
        self.tradeoff.show_kept(self._session.kept_marks())

    def _show_keep(self, *_: Any) -> None:
        self.keep.html = _keep_html(self._session)

    def _repaint(self, *_: Any) -> None:
        theme = THEMES[self._session.theme]
        self.tradeoff.repaint(theme)
        self.phase.repaint(theme)


def _rows(reach: Reach, shown: tuple[str, ...]) -> list[dict[str, Any]]:
    """Rows of the curves' names from the highest value down; those without a value last."""
    rows = [
        {
            "key": key,
            "name": _SHORT.get(key, FAMILIES[key].label),
            "value": _shown_value(reach, key),
            "pending": not reach.exact and _shown_value(reach, key) != NONE,
            "end": _end(reach, key),
        }
        for key in shown
    ]
    # The order FAMILIES are declared in is the order of the curves, lasso apart.
    rows.sort(key=lambda row: (row["key"] == "lasso", list(FAMILIES).index(row["key"])))
    return rows


def _shown_value(reach: Reach, key: str) -> str:
    if reach.is_open(key):
        return ""
    return computed(reach.lowest[key], 3 if reach.exact else 2)


def _end(reach: Reach, key: str) -> float | None:
    """FDP where the curve meets TPP 1; None where it ends before, or is still open."""
    end = reach.ends[key]
    return None if math.isnan(end) else end


def _counts(reach: Reach) -> list[list[str]]:
    """The list that the target asks for, in counts."""
    found = reach.tpp * reach.actives
    listed = found / (1.0 - reach.fdp)
    return [
        ["Such a list, in counts", ""],
        ["found", f"{count(found)} of {count(reach.actives)}"],
        ["false", count(listed - found)],
        ["list", count(listed)],
    ]


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
    """The Keep button, the penalty it keeps, and whether the curves are exact."""
    refusal = session.cannot_keep()
    exact = session.reach is not None and session.reach.exact
    return Markup(
        '<button class="button strong" data-do="keep" data-key="keep" {disabled}>'
        "Keep this point <kbd>K</kbd></button>"
        '<div class="keep-as">as <span class="segments" role="group" '
        'aria-label="Penalty to keep">{options}'
        "</span></div>{state}"
    ).format(
        disabled=Markup('disabled title="{}"').format(refusal) if refusal else "",
        options=Markup("").join(
            Markup(
                '<button data-do="keep-as" data-penalty="{0}" data-key="as-{0}" '
                'aria-pressed="{1}">{2}</button>'
            ).format(key, str(key == session.kept_as).lower(), family.label)
            for key, family in FAMILIES.items()
            if family.witness is not None
        ),
        state=_state_line(session, refusal, exact),
    )


def _state_line(session: Session, refusal: str, exact: bool) -> Markup:
    if session.notice:
        return Markup(
            '<p class="notice">{} <button data-do="undo" data-key="undo">Undo</button></p>'
        ).format(session.notice)
    if refusal:
        return Markup('<p class="notice muted">{}</p>').format(refusal)
    if exact:
        return Markup('<p class="state">exact values</p>')
    return Markup('<p class="state waiting">exact when the hand rests</p>')
