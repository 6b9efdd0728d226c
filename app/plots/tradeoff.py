"""The trade-off plane: FDP against TPP, the boundary of every penalty, and the target."""

from typing import Any

import numpy as np
from bokeh.core.properties import value
from bokeh.models import ColumnDataSource

from app.plots.canvas import Canvas, put
from app.plots.handle import Handle
from app.reach import Curves, Reach
from app.theme import CANVAS_FONT, STROKES, Theme
from app.words import computed
from engine.quantities import FDP, TPP

__all__ = ["TradeoffPlane"]

_DRAWN = ("sorted-l1", "two-level-closed-form", "two-level", "lasso")
_TICKS = [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]


class TradeoffPlane:
    """Figure and sources of the trade-off plane, built once."""

    def __init__(self) -> None:
        self.canvas = Canvas(
            "tradeoff-plane",
            (0.0, 1.0),
            (0.0, 1.0),
            "TPP, share of the actives that is found",
            _TICKS,
            _TICKS,
        )
        empty: dict[str, list[Any]] = {key: [] for key in _DRAWN}
        self.curves = ColumnDataSource(
            {"tpp": [], "hatch": [], **empty}, name="tradeoff-curves"
        )
        self.rules = ColumnDataSource({"x0": [], "y0": [], "x1": [], "y1": [], "dash": []})
        self.limit = ColumnDataSource({"x": [], "y": []})
        self.notes = ColumnDataSource(_notes([]))
        self.names = ColumnDataSource(_notes([]))
        self.target = ColumnDataSource({"x": [], "y": []}, name="target")
        self.kept = ColumnDataSource(
            {"x": [], "y": [], "text": [], "y_target": [], "dx": []}, name="kept"
        )
        self._draw()
        self.handle = Handle(self.figure, self.target, TPP.slider, FDP.slider)

    @property
    def figure(self) -> Any:
        """The Bokeh figure."""
        return self.canvas.figure

    def show_curves(self, curves: Curves, shown: tuple[str, ...], hatched: str) -> None:
        """Draw the boundaries `shown`, and hatch where the penalty `hatched` cannot get."""
        for key, lines in self._lines.items():
            for line in lines:
                line.visible = key in shown
        none = np.isnan(curves.fdp[hatched])
        # Beyond the power limit nothing is in the lasso's reach; an open curve hatches nothing.
        fill = 1.0 if hatched == "lasso" else 0.0
        colour = STROKES[hatched].colour
        self.canvas.token(self._hatch, fill_color=colour, hatch_color=colour)
        self.curves.data = {
            "tpp": curves.tpp,
            "hatch": np.where(none, fill, curves.fdp[hatched]),
            **curves.fdp,
        }

        put(self.names, _notes(_lasso_name(curves) if "lasso" in shown else []))

    def show_reach(self, reach: Reach) -> None:
        """Draw the target, the power limit and picking at random."""
        u, q, limit, chance = reach.tpp, reach.fdp, reach.power_limit, reach.random_fdp
        put(
            self.rules,
            {
                "x0": [0.0, u, 0.0],
                "y0": [q, 0.0, chance],
                "x1": [u, u, 1.0],
                "y1": [q, q, chance],
                "dash": ["solid", "solid", "dotted"],
            },
        )
        shown = [limit, limit] if limit < 1.0 else []
        put(self.limit, {"x": shown, "y": [0.0, 1.0][: len(shown)]})
        self.handle.place(u, q)
        put(self.notes, _notes([*_limit_notes(reach), _random_note(reach), *_closed(reach)]))

    def show_kept(self, kept: list[tuple[str, float, float, float]]) -> None:
        """Mark the kept points (letter, TPP, FDP, FDP of the target they stand for)."""
        put(
            self.kept,
            {
                "text": [letter for letter, *_ in kept],
                "x": [tpp for _, tpp, _, _ in kept],
                "y": [fdp for _, _, fdp, _ in kept],
                "y_target": [aimed for *_, aimed in kept],
                "dx": _apart(kept),
            },
        )

    def clear(self) -> None:
        """Show axes only."""
        for source in (
            self.curves, self.rules, self.limit, self.notes, self.names, self.target, self.kept
        ):  # fmt: skip
            source.data = {name: [] for name in source.data}

    def repaint(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        self.canvas.repaint(theme)

    def _draw(self) -> None:
        canvas, fig = self.canvas, self.canvas.figure
        floor = fig.varea(
            "tpp", 0.0, "sorted-l1", source=self.curves, fill_alpha=0.075, level="underlay"
        )
        hatch = fig.varea(
            "tpp",
            0.0,
            "hatch",
            source=self.curves,
            fill_alpha=0.035,
            hatch_pattern="right_diagonal_line",
            hatch_scale=11,
            hatch_weight=0.8,
            hatch_alpha=0.34,
            level="underlay",
        )
        canvas.token(floor.glyph, fill_color="ink")
        self._hatch = hatch.glyph
        rules = fig.segment(
            "x0", "y0", "x1", "y1", source=self.rules, line_width=1, line_dash="dash",
            level="underlay",
        )  # fmt: skip
        canvas.token(rules.glyph, line_color="edge")
        self._lines = {key: canvas.curve(key, self.curves, "tpp", key) for key in _DRAWN}
        limit = fig.line("x", "y", source=self.limit, line_width=1.6)
        canvas.token(limit.glyph, line_color="power_limit")
        canvas.words(self.notes)
        canvas.words(self.names)
        stem = fig.segment("x", "y", "x", "y_target", source=self.kept, line_width=1.6)
        disc = fig.text(
            "x",
            "y",
            text="text",
            x_offset="dx",
            source=self.kept,
            text_align="center",
            text_baseline="middle",
            text_font=value(CANVAS_FONT),
            text_font_size="11px",
            text_font_style="bold",
            padding=(6, 4),
            border_radius=10,
            border_line_width=2,
        )
        canvas.token(stem.glyph, line_color="ink")
        canvas.token(
            disc.glyph,
            text_color="ink",
            background_fill_color="surface",
            border_line_color="ink",
        )
        canvas.handle(self.target)


_Note = tuple[float, float, str, float, float, str]


def _notes(notes: list[_Note]) -> dict[str, list[Any]]:
    columns = ("x", "y", "text", "dx", "dy", "align")
    values = zip(*notes, strict=True) if notes else [()] * len(columns)
    return dict(zip(columns, map(list, values), strict=True))


def _apart(kept: list[tuple[str, float, float, float]]) -> list[float]:
    """Shift marks that would cover an earlier one to its right, by a mark's width each."""
    shifts: list[float] = []
    for i, (_, tpp, fdp, _) in enumerate(kept):
        near = [
            shifts[j]
            for j, (_, u, q, _) in enumerate(kept[:i])
            if abs(u - tpp) < 0.03 and abs(q - fdp) < 0.04
        ]
        shifts.append(max(near) + 22.0 if near else 0.0)
    return shifts


def _limit_notes(reach: Reach) -> list[_Note]:
    limit = reach.power_limit
    if limit >= 1.0:
        return []
    here, there = f"power limit {computed(limit)}", "no lasso beyond"
    # The words change sides before the right edge would cut them, and the left one too.
    if limit > 0.75:
        return [(limit, 1.0, here, -8.0, 14.0, "right")]
    if limit < 0.25:
        return [(limit, 1.0, f"{here}, {there}", 8.0, 14.0, "left")]
    return [
        (limit, 1.0, here, -8.0, 14.0, "right"),
        (limit, 1.0, there, 8.0, 14.0, "left"),
    ]


def _lasso_name(curves: Curves) -> list[_Note]:
    """Name the lasso on its curve; the others are named at their ends."""
    tpp, fdp = curves.tpp, curves.fdp["lasso"]
    inside = np.flatnonzero(fdp > 0.08)
    if not len(inside):
        return []
    at = inside[len(inside) // 3]
    # To the left of its curve, unless the curve climbs along the frame.
    side = (-14.0, -6.0, "right") if tpp[at] > 0.1 else (14.0, -6.0, "left")
    return [(float(tpp[at]), float(fdp[at]), "lasso", *side)]


def _random_note(reach: Reach) -> _Note:
    chance = reach.random_fdp
    below = 12.0 if chance > 0.9 else -10.0
    text = f"picking at random {computed(chance, 2)}"
    if reach.power_limit < 0.4:  # the left is taken by the words on the power limit
        return (1.0, chance, text, -5.0, below, "right")
    return (0.0, chance, text, 5.0, below, "left")


def _closed(reach: Reach) -> list[_Note]:
    floor = reach.lowest["sorted-l1"]
    if not floor > 0.15:
        return []
    return [(0.5 * (1.0 + reach.tpp) if reach.tpp < 0.4 else 0.5 * reach.tpp, 0.0,
             "out of reach of every sorted L1", 0.0, -22.0, "center")]  # fmt: skip
