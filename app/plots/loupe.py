"""The loupe: the trade-off plane around the target, six times as large.

The boundaries run a few pixels apart there. It shares the plane's sources; the browser moves
its frame with the box that the plane shows.
"""

import math
from pathlib import Path

from bokeh.document import Document
from bokeh.events import DocumentReady
from bokeh.models import ColumnDataSource, CustomJS

from app.plots.boundaries import Boundaries
from app.plots.canvas import Borders, Canvas, Word, put, word_columns
from app.reach import Reach
from app.words import short_name

__all__ = ["Loupe"]

_WIDTH, _HEIGHT = 0.12, 0.10

_FOLLOW = (Path(__file__).parent / "loupe.js").read_text()


class Loupe:
    """Figure and sources of the loupe, built once.

    Parameters
    ----------
    curves, target, kept : ColumnDataSource
        Those of the trade-off plane.
    """

    def __init__(
        self, curves: ColumnDataSource, target: ColumnDataSource, kept: ColumnDataSource
    ) -> None:
        self.canvas = Canvas(
            "loupe-plane", (0.0, _WIDTH), (0.0, _HEIGHT), "", [], [], Borders(0, 0, 0, 0)
        )
        self.box = ColumnDataSource(
            {"left": [], "right": [], "bottom": [], "top": [], "side": []}, name="loupe-box"
        )
        self.side = "right"
        self.crossings = ColumnDataSource({"x": [], "y": []}, name="crossings")
        self.names = ColumnDataSource(word_columns())
        self._draw(curves, target, kept)
        fig = self.canvas.figure
        args = {"x_range": fig.x_range, "y_range": fig.y_range, "box": self.box}
        self._follow = CustomJS(args=args, code=_FOLLOW)
        self.box.js_on_change("data", self._follow)

    def attach(self, doc: Document) -> None:
        """Let the loupe take its place as soon as the page stands."""
        doc.js_on_event(DocumentReady, self._follow)

    def show(self, reach: Reach, shown: tuple[str, ...]) -> None:
        """Centre on the target, or on the boundaries at its TPP where it is far from them."""
        at_target = {
            key: reach.lowest[key] for key in shown if not math.isnan(reach.lowest[key])
        }
        values = list(at_target.values())
        near = any(abs(value - reach.fdp) < 0.4 * _HEIGHT for value in values)
        middle = reach.fdp if near or not values else 0.5 * (min(values) + max(values))
        left = min(max(reach.tpp - 0.5 * _WIDTH, 0.0), 1.0 - _WIDTH)
        bottom = min(max(middle - 0.5 * _HEIGHT, -0.01), 1.0 - _HEIGHT)
        right, top = left + _WIDTH, bottom + _HEIGHT
        # It stands in the right bottom corner, unless its box does.
        self.side = "left" if right > 0.6 and bottom < 0.5 else "right"
        box = {"left": [left], "right": [right], "bottom": [bottom], "top": [top],
               "side": [self.side]}  # fmt: skip
        put(self.box, box if values else {name: [] for name in box})
        put(self.crossings, {"x": [reach.tpp] * len(values), "y": values})
        put(self.names, word_columns(_names(reach.tpp, at_target)))

    def _draw(
        self, curves: ColumnDataSource, target: ColumnDataSource, kept: ColumnDataSource
    ) -> None:
        canvas, fig = self.canvas, self.canvas.figure
        fig.axis.visible = False
        canvas.token(fig, background_fill_color="surface")
        self.boundaries = Boundaries(canvas, curves)
        upright = fig.segment(
            "x", -1.0, "x", 2.0, source=target, line_width=1, level="underlay"
        )
        canvas.token(upright.glyph, line_color="edge")
        canvas.dot(target, 18)
        marks = fig.scatter("x", "y", source=self.crossings, size=6, line_width=1.8)
        canvas.token(marks.glyph, fill_color="surface", line_color="ink")
        canvas.words(self.names)
        canvas.kept(kept)


def _names(tpp: float, at_target: dict[str, float]) -> list[Word]:
    """Name the lowest curve on its right, the others on their left; skip one in the way."""
    words: list[Word] = []
    last = math.inf
    for i, (key, value) in enumerate(sorted(at_target.items(), key=lambda pair: pair[1])):
        if i == 0:
            words.append((tpp, value, short_name(key), 9.0, 11.0, "left"))
        elif abs(value - last) > _LINE:
            words.append((tpp, value, short_name(key), -9.0, -10.0, "right"))
            last = value
    return words


# The height of a word, in FDP.
_LINE = 0.012
