"""The names and values of the curves at the right end of the trade-off plane."""

from pathlib import Path
from typing import ClassVar

import panel as pn
import param

from app.components.styles import SHARED
from app.plots.canvas import BORDERS

__all__ = ["Ends"]


class Ends(pn.custom.JSComponent):
    """Rows in curve order with leaders to the curves' ends; see ends.js."""

    heading = param.String()
    rows = param.List(doc="Dicts of key, name, value (text) and end (FDP at TPP 1, or None).")
    counts = param.List(doc="Pairs of name and text; the first one is the heading.")
    top = param.Number(default=BORDERS.top)
    bottom = param.Number(default=BORDERS.bottom)

    _esm = Path(__file__).parent / "ends.js"
    _stylesheets: ClassVar[list[str]] = [
        SHARED,
        (Path(__file__).parent / "ends.css").read_text(),
    ]
