"""FDP saved against the lasso along TPP, up to where the lasso ends."""

import numpy as np
from bokeh.models import ColumnDataSource, PrintfTickFormatter

from app.plots.boundaries import SAVING
from app.plots.canvas import Borders, Canvas, Word, put, word_columns
from app.reach import Curves
from app.words import short_name

__all__ = ["SavedPlot"]

# The picture shows the first of these heights that holds all savings.
_HEIGHTS = (0.003, 0.01, 0.03, 0.1, 0.3, 1.0)


class SavedPlot:
    """Figure of the savings, built once.

    Parameters
    ----------
    curves, limit : ColumnDataSource
        The boundaries and the power limit, as the trade-off plane has them.
    """

    def __init__(self, curves: ColumnDataSource, limit: ColumnDataSource) -> None:
        borders = Borders(8, 22, 40, 14)
        self.canvas = canvas = Canvas(
            "saved-plot", (0.0, 1.0), (-0.05 * 0.03, 0.03), "", [0.0, 0.5, 1.0], None, borders
        )
        fig = canvas.figure
        fig.yaxis.formatter = PrintfTickFormatter(format="%.2g")
        fig.yaxis.ticker.desired_num_ticks = 3
        closed = fig.harea(y="y", x1="x", x2=1.0, source=limit, level="underlay")
        canvas.hatch(closed.glyph)
        canvas.token(closed.glyph, fill_color="lasso", hatch_color="lasso")
        edge = fig.line("x", "y", source=limit, line_width=1.6)
        canvas.token(edge.glyph, line_color="power_limit")
        self._lines = {key: canvas.curve(key, curves, "tpp", f"saved-{key}") for key in SAVING}
        self.names = ColumnDataSource(word_columns())
        canvas.words(self.names, text_font_size="11px", padding=1)

    def choose(self, shown: tuple[str, ...]) -> None:
        """Draw the curves `shown`."""
        for key, lines in self._lines.items():
            for line in lines:
                line.visible = key in shown

    def show(self, curves: Curves, shown: tuple[str, ...], limit: float) -> None:
        """Fit the height to the savings, and name the curves `shown`."""
        lasso = curves.fdp["lasso"]
        saved = {key: lasso - curves.fdp[key] for key in SAVING if key in shown}
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
