"""FDP saved against the lasso along TPP, up to where the lasso ends."""

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, PrintfTickFormatter

from app.plots.canvas import Borders, Canvas, Word, draw, put, word_columns
from app.reach import Curves
from app.words import short_name

__all__ = ["SavedPlot"]

# The penalties that can save FDP against the lasso where that has a point.
SAVING = ("sorted-l1", "two-level")

# The picture shows the first of these heights that holds all savings.
_HEIGHTS = (0.003, 0.01, 0.03, 0.1, 0.3, 1.0)


class SavedPlot:
    """Figure and sources of the savings, built once."""

    def __init__(self) -> None:
        borders = Borders(8, 22, 40, 14)
        self.canvas = canvas = Canvas(
            "saved-plot", (0.0, 1.0), (-0.05 * 0.03, 0.03), "", [0.0, 0.5, 1.0], None, borders
        )
        columns: dict[str, list[Any]] = {name: [] for name in ("tpp", *SAVING)}
        self.curves = ColumnDataSource(columns, name="saved-curves")
        self.limit = ColumnDataSource({"x": [], "y": []})
        fig = canvas.figure
        fig.yaxis.formatter = PrintfTickFormatter(format="%.2g")
        fig.yaxis.ticker.desired_num_ticks = 3
        closed = fig.harea(y="y", x1="x", x2=1.0, source=self.limit, level="underlay")
        canvas.hatch(closed.glyph)
        canvas.token(closed.glyph, fill_color="lasso", hatch_color="lasso")
        edge = fig.line("x", "y", source=self.limit, line_width=1.6)
        canvas.token(edge.glyph, line_color="power_limit")
        self._lines = {key: canvas.curve(key, self.curves, "tpp", key) for key in SAVING}
        self.names = ColumnDataSource(word_columns())
        canvas.words(self.names, text_font_size="11px", padding=1)

    def choose(self, shown: tuple[str, ...]) -> None:
        """Draw the curves `shown`."""
        for key, lines in self._lines.items():
            for line in lines:
                line.visible = key in shown

    def show(self, curves: Curves, shown: tuple[str, ...], limit: float) -> None:
        """Draw the savings, fit the height to them, and name the curves `shown`."""
        every = {key: curves.fdp["lasso"] - curves.fdp[key] for key in SAVING}
        draw(self.curves, {"tpp": curves.tpp, **every})
        upright = {"x": [limit, limit], "y": [0.0, 1.0]}
        put(self.limit, upright if limit < 1.0 else {"x": [], "y": []})
        saved = {key: each for key, each in every.items() if key in shown}
        most = max((float(np.nanmax(each)) for each in saved.values()), default=0.0)
        height = next(each for each in _HEIGHTS if most <= 0.95 * each or each == 1.0)
        if self.canvas.figure.y_range.end != height:
            self.canvas.figure.y_range.update(start=-0.05 * height, end=height)
        words = [_name(key, curves.tpp, each) for key, each in saved.items()]
        if limit < 0.8:
            middle = 0.5 * (limit + 1.0)
            words.append((middle, 0.75 * height, "no lasso here", 0.0, 0.0, "center"))
        put(self.names, word_columns(words))


def _name(key: str, tpp: np.ndarray, saved: np.ndarray) -> Word:
    """Name a curve left of where it passes a share of its height, each its own."""
    share = {"sorted-l1": 0.3, "two-level": 0.75}[key]
    finite = np.nan_to_num(saved)
    at = int(np.argmax(finite >= share * finite.max()))
    side = "right" if tpp[at] > 0.3 else "left"
    return (
        float(tpp[at]),
        float(finite[at]),
        short_name(key),
        -8.0 if side == "right" else 8.0,
        -4.0,
        side,
    )
