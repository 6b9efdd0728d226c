"""Sorted L1 on neighbouring studies: a small picture of its boundary as one ratio varies."""

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource

from app.plots.canvas import Borders, Canvas, Word, draw, put, word_columns
from app.words import typed
from engine.normal import Array

__all__ = ["SiblingsPlot"]

# A name needs this much of the height, and a value this close to the study's own is not named.
_LINE, _SAME = 0.12, 0.13


class SiblingsPlot:
    """Figure and sources of one family of curves, built once.

    Parameters
    ----------
    name : str
        Name of the figure's model, and of its source with '-curves' added.
    values : tuple of float
        The ratio of each curve.
    at_ends : bool
        Whether the curves are named at their right ends, or along them where all end alike.
    target : ColumnDataSource
        The target, as the trade-off plane has it.
    """

    def __init__(
        self,
        name: str,
        values: tuple[float, ...],
        at_ends: bool,
        target: ColumnDataSource,
    ) -> None:
        self._values, self._at_ends = values, at_ends
        ticks = [0.0, 0.5, 1.0]
        borders = Borders(8, 22, 30, 14)
        right = 1.14 if at_ends else 1.0  # room for names
        self.canvas = canvas = Canvas(name, (0.0, right), (0.0, 1.0), "", ticks, ticks, borders)
        self._keys = tuple(f"c{i}" for i in range(len(values)))
        columns: dict[str, list[Any]] = {key: [] for key in ("tpp", "own", *self._keys)}
        self.curves = ColumnDataSource(columns, name=f"{name}-curves")
        self.names = ColumnDataSource(word_columns())
        for key in self._keys:
            line = canvas.figure.line("tpp", key, source=self.curves, line_width=1.5)
            canvas.token(line.glyph, line_color="sorted_l1")
        canvas.curve("sorted-l1", self.curves, "tpp", "own")
        canvas.words(self.names, text_font_size="11px", padding=1)
        canvas.dot(target, 11)

    def show(self, tpp: Array, curves: tuple[Array, ...], own_value: float, own: Array) -> None:
        """Draw the curves along `tpp` and the study's own, and name them."""
        draw(
            self.curves, {"tpp": tpp, "own": own, **dict(zip(self._keys, curves, strict=True))}
        )
        named = [
            (value, curve)
            for value, curve in zip(self._values, curves, strict=True)
            if abs(value / own_value - 1.0) > _SAME
        ]
        named.append((own_value, own))
        words = _at_ends(named) if self._at_ends else _along(tpp, named)
        put(self.names, word_columns(words))


def _at_ends(named: list[tuple[float, Array]]) -> list[Word]:
    """Name curves right of their ends, pushed apart upwards."""
    words: list[Word] = []
    last = -1.0
    for value, curve in sorted(named, key=lambda pair: float(pair[1][-1])):
        last = max(float(curve[-1]), last + _LINE)
        words.append((1.0, last, typed(round(value, 3)), 5.0, 0.0, "left"))
    over = max(last - 1.0, 0.0)
    return [(x, y - over, *rest) for x, y, *rest in words]


def _along(tpp: Array, named: list[tuple[float, Array]]) -> list[Word]:
    """Name curves on them, each further right than the one above it."""
    ordered = sorted(named, key=lambda pair: pair[0])
    words = []
    for i, (value, curve) in enumerate(ordered):
        at = 0.16 + 0.68 * i / max(len(ordered) - 1, 1)
        height = float(np.interp(at, tpp, curve))
        words.append((at, height, typed(round(value, 3)), 0.0, 0.0, "center"))
    return words
