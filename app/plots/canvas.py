"""What every picture shares: one frame, one type, and colours by token so themes can change.

A picture builds its figure and its sources once; later changes only assign `source.data`.
"""

from typing import Any

from bokeh.core.properties import value
from bokeh.models import ColumnDataSource, GlyphRenderer, NumeralTickFormatter
from bokeh.models.tickers import FixedTicker
from bokeh.plotting import figure

from app.theme import CANVAS_FONT, STROKES, THEMES, Theme

__all__ = ["FRAME_BOTTOM", "FRAME_LEFT", "FRAME_RIGHT", "FRAME_TOP", "Canvas", "put"]

# Fixed borders let the page place its own words beside the frame.
FRAME_TOP, FRAME_BOTTOM, FRAME_LEFT, FRAME_RIGHT = 12, 46, 40, 12


def put(source: ColumnDataSource, data: dict[str, list[Any]]) -> None:
    """Assign short columns to `source`, unless they stand there already."""
    if dict(source.data) != data:
        source.data = data


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
    """

    def __init__(
        self,
        name: str,
        x_range: tuple[float, float],
        y_range: tuple[float, float],
        x_label: str,
        x_ticks: list[float] | None = None,
        y_ticks: list[float] | None = None,
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
            min_border_top=FRAME_TOP,
            min_border_bottom=FRAME_BOTTOM,
            min_border_left=FRAME_LEFT,
            min_border_right=FRAME_RIGHT,
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

    def handle(self, source: ColumnDataSource) -> None:
        """Draw what the user can drag: a yellow core in a ring, with a halo."""
        fig = self.figure
        halo = fig.scatter("x", "y", source=source, size=33, fill_alpha=0.22, line_color=None)
        outer = fig.scatter("x", "y", source=source, size=21, line_color=None)
        core = fig.scatter("x", "y", source=source, size=16, line_width=2.6, name="handle")
        self.token(halo.glyph, fill_color="accent")
        self.token(outer.glyph, fill_color="accent")
        self.token(core.glyph, fill_color="accent", line_color="ring")

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
