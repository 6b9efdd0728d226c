"""What every picture shares: one frame, one type, and colours by token so themes can change.

A picture builds its figure and its sources once; later changes only assign `source.data`.
"""

from collections.abc import Iterable
from typing import Any, NamedTuple

from bokeh.core.properties import value
from bokeh.models import ColumnDataSource, GlyphRenderer, NumeralTickFormatter
from bokeh.models.tickers import FixedTicker
from bokeh.plotting import figure

from app.theme import CANVAS_FONT, STROKES, THEMES, Theme
from engine.normal import Array

__all__ = ["BORDERS", "Borders", "Canvas", "draw", "put", "word_columns"]


class Borders(NamedTuple):
    """Pixels around a frame; being fixed, they let the page place its own things over it."""

    top: int
    bottom: int
    left: int
    right: int


BORDERS = Borders(12, 46, 40, 12)

Word = tuple[float, float, str, float, float, str]


def word_columns(words: Iterable[Word] = ()) -> dict[str, list[Any]]:
    """Return columns for `Canvas.words`: x, y, text, pixels right and down, alignment."""
    columns = list(zip(*words, strict=True)) or [()] * 6
    names = ("x", "y", "text", "dx", "dy", "align")
    return dict(zip(names, map(list, columns), strict=True))


def put(source: ColumnDataSource, data: dict[str, list[Any]]) -> None:
    """Assign short columns to `source`, unless they stand there already."""
    if dict(source.data) != data:
        source.data = data


def draw(source: ColumnDataSource, columns: dict[str, Array]) -> None:
    """Assign columns of numbers as lists: as arrays each would travel in frames of its own.

    Rounded to 1e-6, a thousandth of a pixel.
    """
    source.data = {name: column.round(6).tolist() for name, column in columns.items()}


class Canvas:
    """A figure whose colours are tokens of the theme.

    Parameters
    ----------
    name : str
        Name of the figure's model, by which tests and scripts find it.
    x_range, y_range : tuple of float
        Visible intervals.
    x_label : str
        Axis title; the page writes the y axis' title above the frame.
    x_ticks, y_ticks : sequence of float, optional
        Fixed ticks.
    borders : Borders
        Room around the frame.
    """

    def __init__(
        self,
        name: str,
        x_range: tuple[float, float],
        y_range: tuple[float, float],
        x_label: str,
        x_ticks: list[float] | None = None,
        y_ticks: list[float] | None = None,
        borders: Borders = BORDERS,
    ) -> None:
        self._theme = THEMES["light"]
        self._tokens: dict[tuple[str, str], tuple[Any, str]] = {}
        self.figure = fig = figure(
            name=name,
            x_range=x_range,
            y_range=y_range,
            x_axis_label=x_label,
            sizing_mode="stretch_both",
            toolbar_location=None,
            tools="",
            min_border_top=borders.top,
            min_border_bottom=borders.bottom,
            min_border_left=borders.left,
            min_border_right=borders.right,
        )
        fig.toolbar.autohide = True
        self._style_axes(x_ticks, y_ticks)

    def token(self, model: Any, **tokens: str) -> None:
        """Let each named colour property of `model` follow a token of the theme."""
        for prop, token in tokens.items():
            self._tokens[model.id, prop] = (model, token)
            setattr(model, prop, getattr(self._theme, token))

    def repaint(self, theme: Theme) -> None:
        """Set every colour from `theme`."""
        self._theme = theme
        for (_, prop), (model, token) in self._tokens.items():
            setattr(model, prop, getattr(theme, token))

    def curve(self, key: str, source: ColumnDataSource, x: str, y: str) -> list[GlyphRenderer]:
        """Draw a penalty's line in its own stroke."""
        stroke = STROKES[key]
        fig = self.figure
        line = fig.line(
            x, y, source=source, line_width=stroke.width, line_dash=list(stroke.dash), name=key
        )
        self.token(line.glyph, line_color=stroke.colour)
        if not stroke.double:
            return [line]
        core = fig.line(x, y, source=source, line_width=stroke.double)
        self.token(core.glyph, line_color="surface")
        return [line, core]

    def words(self, source: ColumnDataSource, **style: Any) -> GlyphRenderer:
        """Draw the texts of `source` (x, y, text, dx, dy, align) on a patch of surface."""
        style = {"text_font_size": "12px", "text_baseline": "middle", "padding": 3, **style}
        words = self.figure.text(
            "x",
            "y",
            text="text",
            x_offset="dx",
            y_offset="dy",
            text_align="align",
            text_font=value(CANVAS_FONT),
            background_fill_alpha=0.86,
            source=source,
            **style,
        )
        self.token(words.glyph, text_color="ink", background_fill_color="surface")
        return words

    def dot(self, source: ColumnDataSource, size: float) -> None:
        """Draw where a handle stands: a yellow core in a ring."""
        outer = self.figure.scatter("x", "y", source=source, size=size, line_color=None)
        core = self.figure.scatter("x", "y", source=source, size=0.76 * size, line_width=2)
        self.token(outer.glyph, fill_color="accent")
        self.token(core.glyph, fill_color="accent", line_color="ring")

    def kept(self, source: ColumnDataSource) -> None:
        """Draw kept points: a letter on a disc, and a stem to the target it stands for."""
        stem = self.figure.segment(
            "x", "y", "x_target", "y_target", source=source, line_width=1.6
        )
        disc = self.figure.text(
            "x",
            "y",
            text="text",
            x_offset="dx",
            source=source,
            text_align="center",
            text_baseline="middle",
            text_font=value(CANVAS_FONT),
            text_font_size="11px",
            text_font_style="bold",
            padding=(6, 4),
            border_radius=10,
            border_line_width=2,
        )
        self.token(stem.glyph, line_color="ink")
        self.token(
            disc.glyph,
            text_color="ink",
            background_fill_color="surface",
            border_line_color="ink",
        )

    def hatch(self, glyph: Any) -> None:
        """Hatch an area, in a colour still to be set: a penalty cannot get there."""
        glyph.update(
            fill_alpha=0.035,
            hatch_pattern="right_diagonal_line",
            hatch_scale=11,
            hatch_weight=0.8,
            hatch_alpha=0.34,
        )

    def _style_axes(self, x_ticks: list[float] | None, y_ticks: list[float] | None) -> None:
        fig = self.figure
        fig.outline_line_color = None
        fig.background_fill_color = None  # the card shows through
        fig.border_fill_color = None
        for axis, ticks in ((fig.xaxis, x_ticks), (fig.yaxis, y_ticks)):
            if ticks is not None:
                axis.ticker = FixedTicker(ticks=ticks)
                axis.formatter = NumeralTickFormatter(format="0.0")
            else:
                axis.ticker.desired_num_ticks = 5
            axis.major_tick_line_color = None
            axis.minor_tick_line_color = None
            axis.major_label_text_font_size = "12px"
            axis.major_label_text_font = CANVAS_FONT
            axis.axis_label_text_font = CANVAS_FONT
            axis.axis_label_text_font_size = "12px"
            axis.axis_label_text_font_style = "normal"
            axis.axis_label_standoff = 4
            for model in axis:
                self.token(
                    model,
                    axis_line_color="hairline",
                    major_label_text_color="muted",
                    axis_label_text_color="muted",
                )
        for grid in fig.grid:
            self.token(grid, grid_line_color="hairline")
            grid.grid_line_alpha = 0.6
