"""One upright line at the pointer's TPP through every picture along TPP.

It lives in the browser: moving the pointer sends nothing to Python. The values of the curves at
the pointer stand where their names are; ends.js shows them.
"""

from pathlib import Path

from bokeh.models import ColumnDataSource, CustomJS, Span

from app.plots.canvas import Canvas

__all__ = ["link_crosshair"]

_MOVE = (Path(__file__).parent / "crosshair.js").read_text()
_LEAVE = """
  for (const span of spans) span.setv({visible: false}, {sync: false})
  window.dispatchEvent(new CustomEvent("sparsereach:pointer", {detail: null}))
"""


def link_crosshair(canvases: list[Canvas], curves: ColumnDataSource) -> None:
    """Give all canvases the same line, and tell the page the values of `curves` there."""
    spans = []
    for canvas in canvases:
        span = Span(dimension="height", location=0.0, visible=False, line_width=1)
        canvas.token(span, line_color="edge")
        canvas.figure.add_layout(span)
        spans.append(span)
    move = CustomJS(args={"spans": spans, "curves": curves}, code=_MOVE)
    leave = CustomJS(args={"spans": spans}, code=_LEAVE)
    for canvas in canvases:
        canvas.figure.js_on_event("mousemove", move)
        canvas.figure.js_on_event("mouseleave", leave)
