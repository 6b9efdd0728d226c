"""The Reach page's pictures: two planes with their handles, the curves' names, small plots."""

import math
from functools import partial
from typing import Any

import numpy as np
import panel as pn

from app.afterwards import Afterwards
from app.coalesce import Coalescer
from app.components.ends import Ends
from app.components.grip import Grip
from app.plots.crosshair import link_crosshair
from app.plots.phase import PhasePlane
from app.plots.saved import SavedPlot
from app.plots.siblings import SiblingsPlot
from app.plots.tradeoff import TradeoffPlane
from app.reach import Reach, stand_in
from app.siblings import RATIOS, SPARSITIES
from app.state import Session
from app.theme import THEMES
from app.words import NONE, computed, count, short_name, typed
from engine.limits.families import FAMILIES
from engine.quantities import FDP, SAMPLING_RATIO, SPARSITY, TPP, Quantity

__all__ = ["ReachView"]

# A hand on a plane of some 500 pixels moves in steps of thousandths.
_DRAG_DIGITS = 3


class ReachView:
    """Pictures and words of one session's Reach page, built once."""

    def __init__(self, session: Session, inbox: Coalescer, afterwards: Afterwards) -> None:
        self._session = session
        self._inbox = inbox
        self.tradeoff = plane = TradeoffPlane()
        self.phase = PhasePlane()
        self.by_sparsity = SiblingsPlot("by-sparsity", SPARSITIES, True, plane.target)
        self.by_ratio = SiblingsPlot("by-ratio", RATIOS, False, plane.target)
        self.saved = SavedPlot()
        small = [self.by_sparsity.canvas, self.by_ratio.canvas, self.saved.canvas]
        self._canvases = [plane.canvas, plane.loupe.canvas, *small]
        link_crosshair(self._canvases, plane.curves)
        self.ends = Ends()
        self.target_grip = Grip(
            "Target", "tradeoff-plane", "target", TPP, FDP,
            on_move=partial(self._drag, TPP, FDP), step=TPP.step,
        )  # fmt: skip
        self.study_grip = Grip(
            "Study", "phase-plane", "study", SAMPLING_RATIO, SPARSITY,
            on_move=partial(self._drag, SAMPLING_RATIO, SPARSITY), on_hold=self.phase.hold,
        )  # fmt: skip
        watch = session.param.watch
        later = afterwards.put_off
        watch(self._show_choice, ["hatched", "shown"])
        watch(self._show_curves, ["curves", "hatched"])
        watch(later(self._show_small), ["curves", "siblings", "shown"])
        watch(self._show_needs, ["needs", "hatched", "shown"])
        watch(self._show_reach, ["reach", "problem"])
        watch(later(self._explain), ["reach", "problem", "shown", "kept_as", "keeping"])
        watch(later(self._show_ends), ["reach", "shown"])
        watch(self._show_kept, ["curves"])
        session.kept.param.watch(self._show_kept, ["points"])
        watch(self._repaint, ["theme"])
        self._repaint()
        self._show_choice()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        figures = {
            "tradeoff": self.tradeoff.canvas,
            "loupe": self.tradeoff.loupe.canvas,
            "phase": self.phase.canvas,
            "by_sparsity": self.by_sparsity.canvas,
            "by_ratio": self.by_ratio.canvas,
            "saved": self.saved.canvas,
        }
        return {
            **{
                name: pn.pane.Bokeh(canvas.figure, sizing_mode="stretch_both")
                for name, canvas in figures.items()
            },
            "ends": self.ends,
            "target_grip": self.target_grip,
            "study_grip": self.study_grip,
        }

    # ---- the handles

    def _drag(self, across: Quantity, up: Quantity, x: float, y: float) -> None:
        self._inbox.post(across.name, round(x, _DRAG_DIGITS))
        self._inbox.post(up.name, round(y, _DRAG_DIGITS))

    # ---- what the session changes

    def _show_choice(self, *_: Any) -> None:
        session = self._session
        for plane in (self.tradeoff, self.phase):
            plane.choose(session.shown, session.hatched)
        self.saved.choose(session.shown)

    def _show_curves(self, *_: Any) -> None:
        session = self._session
        if session.curves is not None:
            self.tradeoff.show_curves(session.curves, session.hatched)

    def _show_small(self) -> None:
        """Let the small pictures and the names of curves follow."""
        session = self._session
        found, reach, curves = session.siblings, session.reach, session.curves
        if reach is None or curves is None:
            return
        self.tradeoff.show_names(curves, session.shown)
        self.saved.show(curves, session.shown, reach.power_limit)
        if found is not None:
            own = np.interp(found.tpp, curves.tpp, curves.fdp["sorted-l1"])
            ratio, sparsity = reach.study_ratios
            self.by_sparsity.show(found.tpp, found.by_sparsity, sparsity, own)
            self.by_ratio.show(found.tpp, found.by_ratio, ratio, own)

    def _show_needs(self, *_: Any) -> None:
        session = self._session
        if session.needs is not None:
            self.phase.show_needs(session.needs, session.shown, session.hatched)

    def _show_reach(self, *_: Any) -> None:
        session = self._session
        if session.reach is not None and session.problem is None:
            self.tradeoff.show_reach(session.reach)
            self.phase.show_study(session.reach)

    def _explain(self) -> None:
        session = self._session
        reach, curves = session.reach, session.curves
        if reach is None or curves is None or session.problem is not None:
            return
        self.tradeoff.explain(reach, session.shown)
        self.phase.explain()
        aim = (reach.tpp, reach.fdp)
        point = stand_in(curves, session.kept_as, *aim, session.keeping)
        self.tradeoff.show_stand_in(point, aim)

    def _show_ends(self) -> None:
        session = self._session
        reach = session.reach
        if reach is not None:
            self.ends.param.update(
                heading=f"Lowest FDP\nat TPP {typed(reach.tpp)}",
                rows=_rows(reach, session.shown),
                counts=_counts(reach),
            )

    def _show_kept(self, *_: Any) -> None:
        self.tradeoff.show_kept(self._session.marks())

    def _repaint(self, *_: Any) -> None:
        theme = THEMES[self._session.theme]
        for canvas in (*self._canvases, self.phase.canvas):
            canvas.repaint(theme)


def _rows(reach: Reach, shown: tuple[str, ...]) -> list[dict[str, Any]]:
    """Rows of the curves' names from the highest value down; those without a value last."""
    rows = [
        {
            "key": key,
            "name": short_name(key),
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
