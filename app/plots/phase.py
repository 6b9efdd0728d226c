"""The phase plane: sparsity against sampling ratio, the transition line, and the study."""

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource

from app.plots.canvas import Canvas, put
from app.plots.handle import Handle
from app.reach import Reach
from app.theme import Theme
from engine import critical_sparsity
from engine.quantities import SAMPLING_RATIO, SPARSITY

__all__ = ["PhasePlane"]

# The plane shows the first of these stretches that holds the study with some room.
_RATIO_STRETCHES = (0.6, 1.25, 2.5, 6.0, 24.0)
_SPARSITY_STRETCHES = (0.02, 0.1, 0.4, 1.0)
_ROOM = 0.85


class PhasePlane:
    """Figure and sources of the phase plane, built once."""

    def __init__(self) -> None:
        self.canvas = Canvas(
            "phase-plane",
            (0.0, _RATIO_STRETCHES[0]),
            (0.0, _SPARSITY_STRETCHES[2]),
            "Sampling ratio, runs per candidate",
        )
        ratio = np.concatenate([np.geomspace(1e-4, 0.01, 20), np.linspace(0.011, 1.0, 180)])
        self.transition = ColumnDataSource(
            {
                "ratio": np.concatenate([[0.0], ratio]),
                "sparsity": np.concatenate([[0.0], critical_sparsity(ratio)]),
            },
            name="transition",
        )
        self.study = ColumnDataSource({"x": [], "y": []}, name="study")
        self.notes = ColumnDataSource(
            {"x": [], "y": [], "text": [], "dx": [], "dy": [], "align": []}
        )
        self._draw()
        self.handle = Handle(self.figure, self.study, SAMPLING_RATIO.slider, SPARSITY.slider)

    @property
    def figure(self) -> Any:
        """The Bokeh figure."""
        return self.canvas.figure

    def show_reach(self, reach: Reach) -> None:
        """Mark the study and make room for it."""
        fig, delta, eps = self.figure, reach.sampling_ratio, reach.sparsity
        right = _stretch(delta, _RATIO_STRETCHES)
        top = _stretch(eps, _SPARSITY_STRETCHES)
        if self.handle.held:
            right, top = fig.x_range.end, fig.y_range.end  # the frame stands still for the hand
        if (fig.x_range.end, fig.y_range.end) != (right, top):
            fig.x_range.update(end=right)
            fig.y_range.update(end=top)
            put(self.notes, _transition_note(right, top))
        elif not self.notes.data["x"]:
            put(self.notes, _transition_note(right, top))
        self.handle.place(delta, eps)

    def clear(self) -> None:
        """Show the transition only."""
        put(self.study, {"x": [], "y": []})

    def repaint(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        self.canvas.repaint(theme)

    def _draw(self) -> None:
        canvas = self.canvas
        below = self.figure.varea(
            "ratio", "sparsity", 1.0, source=self.transition, fill_alpha=0.06, level="underlay"
        )
        line = self.figure.line("ratio", "sparsity", source=self.transition, line_width=2)
        canvas.token(below.glyph, fill_color="ink")
        canvas.token(line.glyph, line_color="ink")
        canvas.words(self.notes)
        canvas.handle(self.study)


def _stretch(value: float, stretches: tuple[float, ...]) -> float:
    return next((end for end in stretches if value <= _ROOM * end), stretches[-1])


def _transition_note(right: float, top: float) -> dict[str, list[Any]]:
    """Name the transition where its line is inside the frame, about two thirds along."""
    ratio = np.linspace(0.01, min(right, 0.999), 200)
    height = critical_sparsity(ratio)
    inside = ratio[height < 0.9 * top]
    x = float(inside[int(0.66 * (len(inside) - 1))])
    return {
        "x": [x], "y": [critical_sparsity(x)], "text": ["transition"],
        "dx": [8.0], "dy": [8.0], "align": ["left"],
    }  # fmt: skip
