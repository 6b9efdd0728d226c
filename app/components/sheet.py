"""HTML written by Python, whose buttons and fields speak back."""

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any, ClassVar

import panel as pn
import param

from app.components.loading import when_loaded
from app.components.styles import SHARED

__all__ = ["Sheet"]


class Sheet(pn.custom.JSComponent):
    """A piece of the page; see sheet.js.

    `html` is set from `markupsafe.Markup`, so that whatever a user typed is escaped.
    """

    html = param.String()
    kind = param.String(doc="CSS class of the piece.")
    live = param.Boolean(default=False, doc="Whether screen readers announce changes.")

    _esm = Path(__file__).parent / "sheet.js"
    _stylesheets: ClassVar[list[str]] = [
        SHARED,
        (Path(__file__).parent / "sheet.css").read_text(),
    ]

    def __init__(
        self, kind: str, on_use: Callable[[dict[str, Any]], None] | None = None, **params: Any
    ) -> None:
        super().__init__(kind=kind, **params)
        self._on_use = on_use

    def ask(self, order: str, **details: Any) -> None:
        """Ask the browser for one of the orders in sheet.js."""
        self._send_msg({"order": order, **details})

    def _handle_msg(self, data: dict[str, Any]) -> None:
        if self._on_use is not None:
            when_loaded(partial(self._on_use, data))
