"""The Signal plane: FDP against TPP of every penalty and rule for the signal believed in."""

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource

from app.outlook import COMPARED, Outlook
from app.plots.canvas import Canvas, Word, draw, put, word_columns
from app.theme import STROKES
from engine.normal import Array

__all__ = ["GainsPlane"]

# The strokes of penalties that Reach calls by other names.
STROKE_OF = {family: family for family in COMPARED} | {"designed": "sorted-l1"}

_POINTS = 60


class GainsPlane:
    """Figure and sources of the Signal plane, built once.

    Parameters
    ----------
    boundaries : ColumnDataSource
        The boundaries of Reach, as the trade-off plane has them.
    """

    def __init__(self, boundaries: ColumnDataSource) -> None:
        ticks = [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]
        self.canvas = canvas = Canvas(
            "gains-plane",
            (0.0, 1.0),
            (0.0, 0.6),
            "TPP, share of the actives that is found",
            ticks,
        )
        fig = canvas.figure
        closed = fig.varea("tpp", 0.0, "sorted-l1", source=boundaries, level="underlay")
        canvas.hatch(closed.glyph)
        canvas.token(closed.glyph, fill_color="ink", hatch_color="ink")
        self.rule = ColumnDataSource({"y": []})
        rule = fig.segment(0.0, "y", 1.0, "y", source=self.rule, line_width=1, level="underlay")
        canvas.token(rule.glyph, line_color="edge")
        self.curves: dict[str, ColumnDataSource] = {}
        for family in COMPARED:
            columns: dict[str, list[Any]] = {n: [] for n in ("x", "y", "x_cut", "y_cut")}
            source = ColumnDataSource(columns, name=f"gains-{family}")
            self.curves[family] = source
            self._draw_family(family, source)
        self.points = ColumnDataSource({"x": [], "y": []}, name="gains-points")
        dots = fig.scatter("x", "y", source=self.points, size=7, line_width=1.8)
        canvas.token(dots.glyph, fill_color="surface", line_color="ink")
        self.target = ColumnDataSource({"x": [], "y": []}, name="gains-target")
        canvas.dot(self.target, 18)
        self.names = ColumnDataSource(word_columns())
        canvas.words(self.names, padding=1)

    def show(self, outlooks: dict[str, Outlook], fdp: float) -> None:
        """Draw the curves known, the wanted FDP, and the points that have it."""
        top = 0.6 if fdp <= 0.5 else 1.0
        if self.canvas.figure.y_range.end != top:
            self.canvas.figure.y_range.end = top
        put(self.rule, {"y": [fdp]})
        points = []
        for family, outlook in outlooks.items():
            (x, y), (x_cut, y_cut) = (outlook.curves[rule] for rule in ("nonzero", "two-stage"))
            columns = {"x": x, "y": y, "x_cut": x_cut, "y_cut": y_cut}
            draw(self.curves[family], {n: _even(each) for n, each in columns.items()})
            for rule in ("nonzero", "two-stage"):
                point = outlook.points[rule]
                if not point.reason:
                    points.append((point.tpp, point.fdp))
        put(self.points, {"x": [x for x, _ in points], "y": [y for _, y in points]})
        put(self.names, word_columns(_names(outlooks, fdp, top)))

    def show_best(self, tpp: float, fdp: float) -> None:
        """Mark the point that finds most; nan for none."""
        put(self.target, {"x": [tpp], "y": [fdp]} if tpp == tpp else {"x": [], "y": []})

    def _draw_family(self, family: str, source: ColumnDataSource) -> None:
        """A thin line for what is nonzero in the fit, a thick one for what passes the cut."""
        stroke = STROKES[STROKE_OF[family]]
        for x, y, width in (("x", "y", 1.4), ("x_cut", "y_cut", 3.4)):
            if stroke.double:
                width *= 1.6
            line = self.canvas.figure.line(
                x, y, source=source, line_width=width, line_dash=list(stroke.dash)
            )
            self.canvas.token(line.glyph, line_color=stroke.colour)
            if stroke.double:
                core = self.canvas.figure.line(x, y, source=source, line_width=width * 0.36)
                self.canvas.token(core.glyph, line_color="surface")


def _even(column: Array) -> Array:
    """Give every column the same length; missing nodes repeat the last, or are nan."""
    if not len(column):
        return np.full(_POINTS, np.nan)
    return np.append(column, np.full(max(_POINTS - len(column), 0), column[-1]))[:_POINTS]


def _names(outlooks: dict[str, Outlook], fdp: float, top: float) -> list[Word]:
    """Name the curves where they meet two heights, pushed apart along each."""
    words: list[Word] = [(0.0, fdp, f"your FDP {fdp:.2f}", 5.0, -9.0, "left")]
    for rule, height in (("nonzero", 0.86 * top), ("two-stage", 0.95 * top)):
        found = []
        for family, outlook in outlooks.items():
            x, y = outlook.curves[rule]
            if len(x) > 1 and y.min() < height < y.max():
                order = np.argsort(y)
                found.append((float(np.interp(height, y[order], x[order])), family))
        last = -1.0
        for at, family in sorted(found):
            last = max(at, last + 0.075)
            words.append((last, height, family, 0.0, 0.0, "center"))
    return words
