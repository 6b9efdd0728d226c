"""Colours, strokes and type, declared once for the page's CSS and for the canvases.

Colour names a penalty and nothing else; the rest is ink. A penalty is told by colour and by
stroke, never by colour alone.
"""

from dataclasses import dataclass

__all__ = ["CANVAS_FONT", "STROKES", "THEMES", "Stroke", "Theme", "css_variables"]

CANVAS_FONT = "Segoe UI, Helvetica Neue, Liberation Sans, Arial, sans-serif"


@dataclass(frozen=True)
class Theme:
    """One set of colours; `families` by the penalty's colour name."""

    bg: str
    surface: str
    sunken: str
    ink: str
    muted: str
    hairline: str
    edge: str
    accent: str
    on_accent: str
    ring: str
    focus: str
    warning: str
    warning_bg: str
    power_limit: str
    lasso: str
    two_level: str
    ramp: str
    sorted_l1: str


THEMES = {
    "light": Theme(
        bg="#EAEEF0", surface="#FCFDFD", sunken="#E1E7EA", ink="#111C24", muted="#4C5B66",
        hairline="#CBD4D9", edge="#76848E", accent="#FFD12E", on_accent="#111C24",
        ring="#111C24", focus="#111C24", warning="#A8231B", warning_bg="#FBE9E6",
        power_limit="#3E4C56", lasso="#214BC4", two_level="#CC6A10", ramp="#8F1546",
        sorted_l1="#0E9F8C",
    ),
    "dark": Theme(
        bg="#0B1115", surface="#121A20", sunken="#1B262D", ink="#EAF0F3", muted="#9DADB8",
        hairline="#2C3A43", edge="#667884", accent="#FFD84A", on_accent="#0B1115",
        ring="#0B1115", focus="#FFD84A", warning="#FF9A8C", warning_bg="#33191A",
        power_limit="#B4C2CB", lasso="#3F86F2", two_level="#FFA85C", ramp="#E24C7B",
        sorted_l1="#8BF5DF",
    ),
}  # fmt: skip


@dataclass(frozen=True)
class Stroke:
    """How a penalty's line is drawn: on the canvas, and as a sample in the page.

    A `double` stroke is a wide line in the penalty's colour with a narrow one in the colour
    of the surface on top.
    """

    colour: str
    dash: tuple[int, ...]
    width: float
    css: str
    double: float = 0.0


STROKES = {
    "lasso": Stroke("lasso", (), 2.5, "3px solid"),
    "two-level-closed-form": Stroke("two_level", (2, 3), 2.0, "2px dotted"),
    "ramp": Stroke("ramp", (3, 3), 2.5, "3px dotted"),
    "two-level": Stroke("two_level", (9, 4), 2.5, "3px dashed"),
    "sorted-l1": Stroke("sorted_l1", (), 6.0, "5px double", double=2.2),
}


def css_variables() -> str:
    """Both themes as CSS custom properties, switched by the page's data-theme attribute."""
    return "\n".join(
        f':root[data-theme="{name}"] {{ color-scheme: {name}; {_declarations(theme)} }}'
        for name, theme in THEMES.items()
    )


def _declarations(theme: Theme) -> str:
    colours = vars(theme).items()
    return " ".join(f"--{name.replace('_', '-')}: {value};" for name, value in colours)
