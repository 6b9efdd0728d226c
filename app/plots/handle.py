"""A handle that the hand can drag: the browser moves it at once, Python follows.

The figure's pan events write the handle's source in the browser; the change reaches Python like
any other. While the hand holds it, Python does not write the source back: an answer to where
the hand was would pull the handle from under it.
"""

from collections.abc import Callable
from typing import Any

from bokeh.events import PanEnd
from bokeh.models import ColumnDataSource, CustomJS
from bokeh.plotting import figure

from app.plots.canvas import put

__all__ = ["Handle"]

# As far from the middle of the handle as a fingertip lands.
_HIT_RADIUS = 22

_GRAB = """
  const {x_range, y_range} = figure
  const dx = (cb_obj.x - source.data.x[0]) / (x_range.end - x_range.start) * figure.inner_width
  const dy = (cb_obj.y - source.data.y[0]) / (y_range.end - y_range.start) * figure.inner_height
  source.held = Math.hypot(dx, dy) <= radius
"""
_MOVE = """
  if (!source.held) return
  const within = (v, [low, high]) => Math.min(high, Math.max(low, v))
  source.data = {x: [within(cb_obj.x, x_bounds)], y: [within(cb_obj.y, y_bounds)]}
"""
_RELEASE = "source.held = false"


class Handle:
    """One draggable point.

    Parameters
    ----------
    plot : bokeh figure
        Its pan events are taken.
    source : ColumnDataSource
        Columns x and y, with one row or none.
    x_bounds, y_bounds : tuple of float
        Where the hand may take it.
    """

    def __init__(
        self,
        plot: figure,
        source: ColumnDataSource,
        x_bounds: tuple[float, float],
        y_bounds: tuple[float, float],
    ) -> None:
        self._source = source
        self._held = self._placing = False
        self._on_move: Callable[[float, float], None] | None = None
        self._on_release: Callable[[], None] | None = None
        args: dict[str, Any] = {"source": source, "figure": plot, "radius": _HIT_RADIUS}
        bounds = {"x_bounds": list(x_bounds), "y_bounds": list(y_bounds)}
        plot.js_on_event("panstart", CustomJS(args=args, code=_GRAB))
        plot.js_on_event("pan", CustomJS(args=args | bounds, code=_MOVE))
        plot.js_on_event("panend", CustomJS(args=args, code=_RELEASE))
        plot.on_event(PanEnd, self._release)
        source.on_change("data", self._moved)

    @property
    def held(self) -> bool:
        """Whether a hand holds it."""
        return self._held

    def follow(
        self, on_move: Callable[[float, float], None], on_release: Callable[[], None]
    ) -> None:
        """Call `on_move` with where the hand takes it, `on_release` when it lets go."""
        self._on_move, self._on_release = on_move, on_release

    def place(self, x: float, y: float) -> None:
        """Put the handle where the session has it, unless a hand holds it."""
        if not self._held:
            self._placing = True
            put(self._source, {"x": [x], "y": [y]})
            self._placing = False

    def _moved(self, attr: str, old: Any, new: Any) -> None:
        if self._placing or self._on_move is None or not len(new["x"]):
            return
        self._held = True
        self._on_move(float(new["x"][0]), float(new["y"][0]))

    def _release(self, event: Any) -> None:
        if self._held:
            self._held = False
            if self._on_release is not None:
                self._on_release()
