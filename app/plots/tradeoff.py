"""The trade-off plane: FDP against TPP, the boundary of every penalty, and the target."""

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource

from app.kept import Mark
from app.plots.boundaries import DRAWN, Boundaries
from app.plots.canvas import Canvas, Word, draw, put, word_columns
from app.plots.loupe import Loupe
from app.reach import Curves, Reach
from app.theme import STROKES
from app.words import computed

__all__ = ["TradeoffPlane"]

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
        columns: dict[str, list[Any]] = {name: [] for name in ("tpp", "hatch", *DRAWN)}
        self.curves = ColumnDataSource(columns, name="tradeoff-curves")
        self.rules = ColumnDataSource({"x0": [], "y0": [], "x1": [], "y1": [], "dash": []})
        self.limit = ColumnDataSource({"x": [], "y": []})
        self.notes = ColumnDataSource(word_columns())
        self.names = ColumnDataSource(word_columns())
        self.target = ColumnDataSource({"x": [], "y": []}, name="target")
        self.kept = ColumnDataSource(
            {"x": [], "y": [], "text": [], "x_target": [], "y_target": [], "dx": []},
            name="kept",
        )
        self.stand_in = ColumnDataSource(
            {"x": [], "y": [], "x_target": [], "y_target": []}, name="stand-in"
        )
        self.loupe = Loupe(self.curves, self.target, self.kept)
        self._draw()

    @property
    def figure(self) -> Any:
        """The Bokeh figure."""
        return self.canvas.figure

    def choose(self, shown: tuple[str, ...], hatched: str) -> None:
        """Draw the boundaries `shown`, and hatch in the colour of `hatched`."""
        for boundaries in (self._boundaries, self.loupe.boundaries):
            boundaries.choose(shown, STROKES[hatched].colour)

    def show_curves(self, curves: Curves, hatched: str) -> None:
        """Draw the boundaries, and hatch where the penalty `hatched` cannot get."""
        none = np.isnan(curves.fdp[hatched])
        # Beyond the power limit nothing is in the lasso's reach; an open curve hatches nothing.
        fill = 1.0 if hatched == "lasso" else 0.0
        hatch = np.where(none, fill, curves.fdp[hatched])
        draw(self.curves, {"tpp": curves.tpp, "hatch": hatch, **curves.fdp})

    def show_names(self, curves: Curves, shown: tuple[str, ...]) -> None:
        """Name the lasso; the names of the others stand at their ends."""
        put(self.names, word_columns(_lasso_name(curves) if "lasso" in shown else ()))

    def show_reach(self, reach: Reach) -> None:
        """Draw the target, the power limit and picking at random."""
        u, q, limit = reach.tpp, reach.fdp, reach.power_limit
        random = reach.random_fdp
        put(
            self.rules,
            {
                "x0": [0.0, u, 0.0],
                "y0": [q, 0.0, random],
                "x1": [u, u, 1.0],
                "y1": [q, q, random],
                "dash": ["solid", "solid", "dotted"],
            },
        )
        upright = {"x": [limit, limit], "y": [0.0, 1.0]}
        put(self.limit, upright if limit < 1.0 else {"x": [], "y": []})
        put(self.target, {"x": [u], "y": [q]})

    def explain(self, reach: Reach, shown: tuple[str, ...]) -> None:
        """Put words beside the lines, and the loupe where the target is."""
        self.loupe.show(reach, shown)
        chance = _random_note(reach, at_right=self.loupe.side == "left")
        put(self.notes, word_columns([*_limit_notes(reach), chance, *_closed(reach)]))

    def show_stand_in(
        self, point: tuple[float, float] | None, aim: tuple[float, float]
    ) -> None:
        """Mark the point that would be kept for a target out of reach."""
        columns = {"x": [], "y": [], "x_target": [], "y_target": []}
        if point is not None:
            values = (*point, *aim)
            columns = {key: [value] for key, value in zip(columns, values, strict=True)}
        put(self.stand_in, columns)

    def show_kept(self, kept: list[Mark]) -> None:
        """Mark the kept points, each with a stem from the target that it stands for."""
        put(
            self.kept,
            {
                "text": [mark.letter for mark in kept],
                "x": [mark.tpp for mark in kept],
                "y": [mark.fdp for mark in kept],
                "x_target": [mark.target_tpp for mark in kept],
                "y_target": [mark.target_fdp for mark in kept],
                "dx": _apart(kept),
            },
        )

    def _draw(self) -> None:
        canvas, fig = self.canvas, self.canvas.figure
        box = fig.quad("left", "right", "bottom", "top", source=self.loupe.box, fill_color=None)
        canvas.token(box.glyph, line_color="ink")
        rules = fig.segment(
            "x0", "y0", "x1", "y1", source=self.rules, line_width=1, line_dash="dash",
            level="underlay",
        )  # fmt: skip
        canvas.token(rules.glyph, line_color="edge")
        self._boundaries = Boundaries(canvas, self.curves)
        limit = fig.line("x", "y", source=self.limit, line_width=1.6)
        canvas.token(limit.glyph, line_color="power_limit")
        canvas.words(self.notes)
        canvas.words(self.names)
        stem = fig.segment(
            "x", "y", "x_target", "y_target", source=self.stand_in, line_dash="dotted"
        )
        ring = fig.scatter("x", "y", source=self.stand_in, size=11, line_width=1.6)
        canvas.token(stem.glyph, line_color="ink")
        canvas.token(ring.glyph, line_color="ink", fill_color="surface")
        canvas.kept(self.kept)
        canvas.dot(self.target, 16)


def _apart(kept: list[Mark]) -> list[float]:
    """Shift marks that would cover an earlier one to its right, by a mark's width each."""
    shifts: list[float] = []
    for i, mark in enumerate(kept):
        near = [
            shifts[j]
            for j, other in enumerate(kept[:i])
            if abs(other.tpp - mark.tpp) < 0.03 and abs(other.fdp - mark.fdp) < 0.04
        ]
        shifts.append(max(near) + 22.0 if near else 0.0)
    return shifts


def _limit_notes(reach: Reach) -> list[Word]:
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


def _lasso_name(curves: Curves) -> list[Word]:
    """Name the lasso on its curve; the others are named at their ends."""
    tpp, fdp = curves.tpp, curves.fdp["lasso"]
    inside = np.flatnonzero(fdp > 0.08)
    if not len(inside):
        return []
    at = inside[len(inside) // 3]
    # To the left of its curve, unless the curve climbs along the frame.
    side = (-14.0, -6.0, "right") if tpp[at] > 0.1 else (14.0, -6.0, "left")
    return [(float(tpp[at]), float(fdp[at]), "lasso", *side)]


def _random_note(reach: Reach, at_right: bool) -> Word:
    chance = reach.random_fdp
    below = 12.0 if chance > 0.9 else -10.0
    text = f"picking at random {computed(chance, 2)}"
    if at_right or reach.power_limit < 0.4:  # the left is taken by the loupe or other words
        return (1.0, chance, text, -5.0, below, "right")
    return (0.0, chance, text, 5.0, below, "left")


def _closed(reach: Reach) -> list[Word]:
    floor = reach.lowest["sorted-l1"]
    if not floor > 0.15:
        return []
    return [(0.5 * (1.0 + reach.tpp) if reach.tpp < 0.4 else 0.5 * reach.tpp, 0.0,
             "out of reach of every sorted L1", 0.0, -22.0, "center")]  # fmt: skip
