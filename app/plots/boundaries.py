"""The boundaries of every penalty along TPP, as the trade-off plane and its loupe draw them."""

from bokeh.models import ColumnDataSource

from app.plots.canvas import Canvas

__all__ = ["DRAWN", "Boundaries"]

# In the order they are drawn; later ones lie on top.
DRAWN = ("sorted-l1", "two-level-closed-form", "two-level", "lasso")


class Boundaries:
    """Lines, the shaded floor below which no penalty gets, and the hatched region of one."""

    def __init__(self, canvas: Canvas, curves: ColumnDataSource) -> None:
        self._canvas = canvas
        fig = canvas.figure
        floor = fig.varea(
            "tpp", 0.0, "sorted-l1", source=curves, fill_alpha=0.075, level="underlay"
        )
        canvas.token(floor.glyph, fill_color="ink")
        self._hatch = fig.varea("tpp", 0.0, "hatch", source=curves, level="underlay").glyph
        canvas.hatch(self._hatch)
        self._lines = {key: canvas.curve(key, curves, "tpp", key) for key in DRAWN}

    def choose(self, shown: tuple[str, ...], hatch_colour: str) -> None:
        """Show the lines of some penalties, and hatch in a penalty's colour."""
        for key, lines in self._lines.items():
            for line in lines:
                line.visible = key in shown
        self._canvas.token(self._hatch, fill_color=hatch_colour, hatch_color=hatch_colour)
