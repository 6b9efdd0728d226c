"""Contrast and colour distance of both themes, recomputed from the tokens.

Contrast: relative luminance and ratio of WCAG 2.2 (W3C Recommendation, 2023): at least 4.5 for
text and 3 for lines. Colour vision: the matrices of *A physiologically-based model for
simulation of color vision deficiency*, IEEE TVCG 15(6), 2009, severity 1 (from memory).
Difference: CIE76 in CIELAB (textbook formula), where 10 is told apart at a glance.
"""

import itertools

import numpy as np
import pytest

from app.theme import STROKES, THEMES, css_variables

FAMILY_COLOURS = ("lasso", "two_level", "ramp", "sorted_l1")

VISION = {
    "normal": np.eye(3),
    "protan": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216],
         [-0.003882, -0.048116, 1.051998]]
    ),
    "deutan": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413],
         [-0.011820, 0.042940, 0.968881]]
    ),
    "tritan": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602],
         [0.004733, 0.691367, 0.303900]]
    ),
}  # fmt: skip


def linear(colour: str) -> np.ndarray:
    channels = np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)]) / 255.0
    return np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)


def contrast(one: str, other: str) -> float:
    levels = sorted(float(linear(c) @ [0.2126, 0.7152, 0.0722]) for c in (one, other))
    return (levels[1] + 0.05) / (levels[0] + 0.05)


def lab(rgb: np.ndarray) -> np.ndarray:
    to_xyz = np.array(
        [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    )
    xyz = to_xyz @ np.clip(rgb, 0.0, 1.0) / (to_xyz @ np.ones(3))
    f = np.where(xyz > (6 / 29) ** 3, np.cbrt(xyz), xyz / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
def test_text_can_be_read(theme):
    pairs = [
        (theme.ink, theme.bg), (theme.ink, theme.surface), (theme.muted, theme.bg),
        (theme.muted, theme.surface), (theme.warning, theme.warning_bg),
        (theme.on_accent, theme.accent), (theme.surface, theme.ink),
    ]  # fmt: skip
    assert min(contrast(*pair) for pair in pairs) >= 4.5


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
def test_lines_and_edges_can_be_seen(theme):
    colours = [getattr(theme, name) for name in (*FAMILY_COLOURS, "power_limit", "edge")]
    assert min(contrast(colour, theme.surface) for colour in colours) >= 3.0


@pytest.mark.parametrize("theme", THEMES.values(), ids=THEMES)
@pytest.mark.parametrize("vision", VISION)
def test_families_are_told_apart(theme, vision):
    seen = [lab(VISION[vision] @ linear(getattr(theme, name))) for name in FAMILY_COLOURS]
    assert min(np.linalg.norm(a - b) for a, b in itertools.combinations(seen, 2)) >= 10.0


def test_no_two_penalties_share_a_stroke():
    strokes = [(s.dash, s.double > 0.0) for s in STROKES.values()]
    assert len(set(strokes)) == len(strokes)


def test_every_colour_reaches_the_page():
    css = css_variables()
    for theme in THEMES.values():
        assert all(f": {colour};" in css for colour in vars(theme).values())
