"""The bare page that latency is measured against: one slider, one source, nothing else.

It sends as many numbers a step as the Reach page does, over sockets with the same setting, and
gathers slider events for as long as the Reach page does.
"""

import sys

import numpy as np
import panel as pn
from bokeh.plotting import figure

from app.coalesce import WINDOW_MS
from app.server import quicken_sockets

ROWS, COLUMNS = int(sys.argv[2]), int(sys.argv[3])


class QuickSlider(pn.widgets.FloatSlider):
    """A slider that waits for `WINDOW_MS` instead of Panel's 50 ms."""

    _debounce = WINDOW_MS


def page() -> pn.Column:
    slider = QuickSlider(name="value", start=0, end=10_000, step=1, value=600)
    plot = figure(width=600, height=400, x_range=(0, 1), y_range=(0, 20_000))
    names = [f"c{i}" for i in range(COLUMNS)]
    source = plot.line("c0", "c1", source={name: np.zeros(ROWS) for name in names})
    source.data_source.name = "bare"

    def show(event: object) -> None:
        column = np.full(ROWS, slider.value)
        source.data_source.data = dict.fromkeys(names, column)

    slider.param.watch(show, "value")
    return pn.Column(slider, plot)


if __name__ == "__main__":
    quicken_sockets()
    pn.serve(
        page, port=int(sys.argv[1]), address="127.0.0.1", show=False, liveness=True,
        websocket_origin=[f"127.0.0.1:{sys.argv[1]}"],
    )  # fmt: skip
