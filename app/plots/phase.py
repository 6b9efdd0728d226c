"""The phase plane: the study, and which studies can meet the target, per penalty."""

from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, CustomJS, Span

from app.plots.boundaries import DRAWN
from app.plots.canvas import Canvas, Word, draw, put, word_columns
from app.reach import Needs, Reach
from app.theme import STROKES
from app.words import short_name
from engine import critical_sparsity
from engine.limits.needed import studies_of_limit

__all__ = ["PhasePlane"]

# The plane shows the first of these stretches that holds the study with some room.
_RATIO_STRETCHES = (0.6, 1.25, 2.5, 6.0, 24.0)
_SPARSITY_STRETCHES = (0.02, 0.1, 0.4, 1.0)
_ROOM = 0.85

_POINT = (Path(__file__).parent / "phase.js").read_text()

# Lines of equal power limit; the plane is a shade darker above each.
_LIMITS = (0.8, 0.6, 0.4, 0.2)


class PhasePlane:
    """Figure and sources of the phase plane, built once."""

    def __init__(self) -> None:
        self.canvas = Canvas(
            "phase-plane",
            (0.0, _RATIO_STRETCHES[0]),
            (0.0, _SPARSITY_STRETCHES[2]),
            "Sampling ratio, runs per candidate",
        )
        self._held = False
        ratio = np.concatenate([np.geomspace(1e-4, 0.01, 20), np.linspace(0.011, 1.0, 180)])
        self.transition = ColumnDataSource(
            {
                "ratio": np.concatenate([[0.0], ratio]),
                "sparsity": np.concatenate([[0.0], critical_sparsity(ratio)]),
            },
            name="transition",
        )
        columns = ("sparsity", "hatch", *DRAWN)
        self.needs = ColumnDataSource({name: [] for name in columns}, name="needs")
        self.chance = ColumnDataSource({"x0": [], "x1": [], "y": []})
        self.study = ColumnDataSource({"x": [], "y": []}, name="study")
        self.limits = ColumnDataSource(word_columns())
        self.notes = ColumnDataSource(word_columns())
        self._draw()
        self._point()

    @property
    def figure(self) -> Any:
        """The Bokeh figure."""
        return self.canvas.figure

    def hold(self, held: bool) -> None:
        """Let the frame stand still while a hand holds the study."""
        self._held = held

    def show_study(self, reach: Reach) -> None:
        """Mark the study and make room for it."""
        fig, delta, eps = self.figure, reach.sampling_ratio, reach.sparsity
        right = _stretch(delta, _RATIO_STRETCHES)
        top = _stretch(eps, _SPARSITY_STRETCHES)
        if self._held:
            right, top = fig.x_range.end, fig.y_range.end
        if (fig.x_range.end, fig.y_range.end) != (right, top):
            fig.x_range.update(end=right)
            fig.y_range.update(end=top)
        put(self.study, {"x": [delta], "y": [eps]})

    def explain(self) -> None:
        """Name the transition and the lines of equal power limit."""
        fig = self.figure
        put(self.limits, word_columns(_limit_words(fig.x_range.end, fig.y_range.end)))

    def choose(self, shown: tuple[str, ...], hatched: str) -> None:
        """Draw the lines of the penalties `shown`, and hatch in the colour of `hatched`."""
        for key, lines in self._lines.items():
            for line in lines:
                line.visible = key in shown
        colour = STROKES[hatched].colour
        self.canvas.token(self._hatch, fill_color=colour, hatch_color=colour)

    def show_needs(self, needs: Needs, shown: tuple[str, ...], hatched: str) -> None:
        """Draw who can meet the target where, and hatch where `hatched` cannot."""
        columns = {"sparsity": needs.sparsity, "hatch": needs.ratio[hatched]}
        draw(self.needs, columns | needs.ratio)
        right, top = self.figure.x_range.end, self.figure.y_range.end
        chance = needs.random_sparsity
        put(self.chance, {"x0": [0.0], "x1": [2.0 * _RATIO_STRETCHES[-1]], "y": [chance]})
        words = [_name(key, needs, right, top) for key in DRAWN if key in shown]
        words += [_random_word(chance, top)]
        put(self.notes, word_columns(word for word in words if word))

    def _draw(self) -> None:
        canvas, fig = self.canvas, self.figure
        for limit in (*_LIMITS, 1.0):
            self._draw_limit(limit)
        floor = fig.harea(
            y="sparsity", x1=0.0, x2="sorted-l1", source=self.needs, fill_alpha=0.075,
            level="underlay",
        )  # fmt: skip
        canvas.token(floor.glyph, fill_color="ink")
        self._hatch = fig.harea(
            y="sparsity", x1=0.0, x2="hatch", source=self.needs, level="underlay"
        ).glyph
        canvas.hatch(self._hatch)
        chance = fig.segment(
            "x0", "y", "x1", "y", source=self.chance, line_dash="dotted", line_width=1
        )
        canvas.token(chance.glyph, line_color="edge")
        line = fig.line("ratio", "sparsity", source=self.transition, line_width=2)
        canvas.token(line.glyph, line_color="ink")
        self._lines = {key: canvas.curve(key, self.needs, key, "sparsity") for key in DRAWN}
        canvas.dot(self.study, 16)
        canvas.words(self.limits, text_font_size="11px", padding=2)
        canvas.words(self.notes)

    def _point(self) -> None:
        """Let the browser tell the power limit at the pointer, without a word to Python."""
        canvas, fig = self.canvas, self.figure
        words = ColumnDataSource(word_columns())
        lines = [
            Span(dimension=dimension, location=0.0, visible=False, line_width=1)
            for dimension in ("height", "width")
        ]
        for line in lines:
            canvas.token(line, line_color="edge")
            fig.add_layout(line)
        canvas.words(words)
        args = {
            "transition": self.transition, "words": words, "upright": lines[0],
            "level": lines[1], "x_range": fig.x_range, "y_range": fig.y_range,
        }  # fmt: skip
        fig.js_on_event("mousemove", CustomJS(args=args, code=_POINT))
        fig.js_on_event("mouseleave", CustomJS(args=args, code=f"cb_obj = {{x: -1}}; {_POINT}"))

    def _draw_limit(self, limit: float) -> None:
        """Shade the studies whose power limit is lower, and draw the line where it is met."""
        canvas, fig = self.canvas, self.figure
        ratio, sparsity = studies_of_limit(limit)
        data = {"ratio": np.append(0.0, ratio), "sparsity": np.append(0.0, sparsity)}
        source = self.transition if limit == 1.0 else ColumnDataSource(data)
        shade = fig.varea(
            "ratio", "sparsity", 1.0, source=source, fill_alpha=0.045, level="underlay"
        )
        canvas.token(shade.glyph, fill_color="ink")
        if limit < 1.0:
            edge = fig.line(
                "ratio", "sparsity", source=source, line_width=0.8, level="underlay"
            )
            canvas.token(edge.glyph, line_color="edge")


def _stretch(value: float, stretches: tuple[float, ...]) -> float:
    return next((end for end in stretches if value <= _ROOM * end), stretches[-1])


@lru_cache(maxsize=32)
def _limit_words(right: float, top: float) -> list[Word]:
    """Name the transition and the lines of equal power limit inside the frame."""
    ratio = np.linspace(0.01, min(right, 0.999), 200)
    height = critical_sparsity(ratio)
    inside = ratio[height < 0.9 * top]
    x = float(inside[int(0.66 * (len(inside) - 1))])
    words: list[Word] = [(x, critical_sparsity(x), "transition", 8.0, 8.0, "left")]
    for limit in _LIMITS:
        ratio, sparsity = studies_of_limit(limit)
        at = float(np.interp(0.93 * top, sparsity, ratio))
        if 0.03 * right < at < 0.97 * right:
            words.append((at, 0.93 * top, f"{limit:.1f}", 0.0, 0.0, "center"))
    return words


# Where along its line, from sparsity 0 to that of random picks, each name stands, and how.
_NAMED_AT = {
    "lasso": (0.82, 8.0, 4.0, "left"),
    "two-level-closed-form": (0.9, 8.0, -8.0, "left"),
    "two-level": (0.5, -8.0, 0.0, "right"),
    "sorted-l1": (0.68, -8.0, 0.0, "right"),
}


def _name(key: str, needs: Needs, right: float, top: float) -> Word | None:
    """Name a line beside it, where that is inside the frame and not at its very left."""
    share, dx, dy, align = _NAMED_AT[key]
    if needs.random_sparsity < 0.3 * top:
        return None
    y = share * min(needs.random_sparsity, 0.86 * top)
    x = float(np.interp(y, needs.sparsity, needs.ratio[key]))
    if x > 0.8 * right and align == "left":
        dx, align = -dx, "right"
    if not (0.3 * right if align == "right" else 0.0) < x < 0.98 * right:
        return None
    return (x, y, short_name(key), dx, dy, align)


def _random_word(chance: float, top: float) -> Word | None:
    if chance > 0.93 * top:
        return None
    return (0.0, chance, "from here up, picking at random does it", 6.0, -10.0, "left")
