"""A quantity's control: number field and slider, or count and ratio on one slider."""

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any, ClassVar

import panel as pn
import param

from app.components.loading import when_loaded
from app.components.styles import SHARED
from engine.quantities import Quantity

__all__ = ["Control"]


class Control(pn.custom.JSComponent):
    """What the browser shows of one quantity; see control.js.

    It holds no state of its own: what the user does is handed to `on_change`, and the session
    answers by setting `value`, or `error`.
    """

    field = param.String(doc="Name of the quantity, sent with every change.")
    label = param.String()
    hint = param.String()
    meaning = param.String()
    value = param.Number(default=None, allow_None=True)
    low = param.Number(default=0.0)
    high = param.Number(default=1.0)
    scale = param.Selector(default="linear", objects=["linear", "log", "cube root"])
    step = param.Number(default=1.0)
    digits = param.Integer(default=2)
    whole = param.Boolean(default=False)
    per = param.Number(default=None, allow_None=True, doc="Denominator of the ratio.")
    per_field = param.String(doc="Name of the ratio; empty without one.")
    per_label = param.String()
    tick = param.Number(default=None, allow_None=True, doc="A value marked on the track.")
    error = param.String(doc="What is wrong with the last change; empty when nothing is.")
    error_field = param.String()
    accepted = param.Integer(default=0, doc="Rises when a change was accepted.")

    _esm = Path(__file__).parent / "control.js"
    _stylesheets: ClassVar[list[str]] = [
        SHARED,
        (Path(__file__).parent / "control.css").read_text(),
    ]

    def __init__(
        self,
        quantity: Quantity,
        on_change: Callable[[dict[str, Any]], None],
        ratio: Quantity | None = None,
        **params: Any,
    ) -> None:
        low, high = quantity.slider
        params = {
            "field": quantity.name,
            "label": quantity.label,
            "meaning": quantity.meaning,
            "whole": quantity.whole,
            "scale": quantity.scale,
            "step": quantity.step,
            "low": low,
            "high": high,
            "name": quantity.name,
            **params,
        }
        if ratio is not None:
            params |= {"per_field": ratio.name, "per_label": ratio.label}
        super().__init__(**params)
        self._on_change = on_change

    def _handle_msg(self, data: dict[str, Any]) -> None:
        when_loaded(partial(self._on_change, data))
