"""A handle over a figure: dragged by mouse or finger, moved by arrow keys."""

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any, ClassVar

import panel as pn
import param

from app.components.loading import when_loaded
from app.components.styles import SHARED
from app.plots.canvas import BORDERS
from engine.quantities import Quantity

__all__ = ["Grip"]


class Grip(pn.custom.JSComponent):
    """One draggable point; see grip.js.

    It stands where the figure's source has it. While a hand holds it the browser moves it at
    once, and takes no place from Python: an answer to where the hand was would pull the handle
    from under it.

    Parameters
    ----------
    figure, source : str
        Names of the models: the figure under it, and columns x and y with one row or none.
    across, up : Quantity
        What its place means.
    on_move : callable
        Receives (x, y) wherever the hand or the keys take it.
    on_hold : callable, optional
        Receives True when a hand takes it and False when it lets go.
    step : float
        Where a hand lets go of it, it rests on whole steps.
    """

    figure = param.String()
    source = param.String()
    label = param.String()
    names = param.List(doc="Labels of x and y.")
    step = param.Number(default=0.0, doc="It rests on whole steps of both; 0 for anywhere.")
    bounds = param.List(doc="Lowest and highest x, lowest and highest y.")
    borders = param.List(default=list(BORDERS), doc="Pixels around the figure's frame.")

    _esm = Path(__file__).parent / "grip.js"
    _stylesheets: ClassVar[list[str]] = [
        SHARED,
        (Path(__file__).parent / "grip.css").read_text(),
    ]

    def __init__(
        self,
        label: str,
        figure: str,
        source: str,
        across: Quantity,
        up: Quantity,
        on_move: Callable[[float, float], None],
        on_hold: Callable[[bool], None] | None = None,
        step: float = 0.0,
    ) -> None:
        super().__init__(
            step=step,
            label=label,
            figure=figure,
            source=source,
            names=[across.label, up.label],
            bounds=[*across.slider, *up.slider],
        )
        self._on_move, self._on_hold = on_move, on_hold

    def _handle_msg(self, data: dict[str, Any]) -> None:
        when_loaded(partial(self._use, data))

    def _use(self, data: dict[str, Any]) -> None:
        if "held" not in data:
            self._on_move(float(data["x"]), float(data["y"]))
        elif self._on_hold is not None:
            self._on_hold(bool(data["held"]))
