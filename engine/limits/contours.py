"""The studies that can meet a target, per penalty, as lines in the phase plane.

A line gives, for sparsities below the one from which picking at random meets the target, the
least sampling ratio at which some signal lets the penalty meet it. For the lasso and the
closed form that ratio is explicit (`engine.limits.needed`). For the searched penalties it is
read off a table of the atlas: FDP over sampling ratio, sparsity and TPP, straight between
nodes. Tests state how far those lines stray; they are for drawing.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from engine.limits.atlas import PENALTIES, Atlas
from engine.limits.needed import closed_form_needs, lasso_needs
from engine.normal import Array

__all__ = ["Contours", "contours_from"]

# Nodes crowd where the lines bend: at small ratios and sparsities, and towards a ratio of 1.
_RATIOS = np.concatenate(
    [
        [0.0],
        np.geomspace(0.01, 0.1, 24)[:-1],
        np.linspace(0.1, 0.93, 84)[:-1],
        np.linspace(0.93, 1.05, 25)[:-1],
        np.geomspace(1.05, 20.0, 28),
    ]
)
_SPARSITIES = np.linspace(0.0005 ** (1 / 3), 0.98 ** (1 / 3), 64) ** 3
_TPPS = np.linspace(0.0, 1.0, 201)

# Nodes of a line, as shares of the sparsity from which picking at random does; just below it
# the lines of all but the lasso turn towards ratio 0.
_SHARES = np.concatenate(
    [
        [1e-9],
        np.linspace(0.03, 0.9, 28) ** 1.5 / 0.9**0.5,
        1.0 - 0.09 * np.linspace(0.95, 0.0, 12) ** 2,
    ]
)
_SHARES[-1] = 1.0 - 1e-9


@dataclass(frozen=True)
class Contours:
    """FDP of the searched penalties, of shape (TPP, sparsity, sampling ratio) each."""

    tables: dict[str, npt.NDArray[np.float32]]

    def lines(self, tpp: float, fdp: float) -> tuple[Array, dict[str, Array]]:
        """Return sparsities, rising to that of random picks, and the ratios needed there.

        The arguments are trusted.
        """
        sparsity = (1.0 - fdp) * _SHARES
        lasso = lasso_needs(tpp, fdp, sparsity)
        closed = closed_form_needs(tpp, fdp, sparsity, lasso)
        lines = {"lasso": lasso, "two-level-closed-form": closed}
        ceiling = closed
        for key in PENALTIES:
            read = self._crossing(key, tpp, fdp, sparsity)
            lines[key] = ceiling = np.minimum(read, ceiling)  # the order is certain
        return sparsity, lines

    def _crossing(self, key: str, tpp: float, fdp: float, sparsity: Array) -> Array:
        """The ratio from which on the FDP at `tpp` is at most `fdp`."""
        at_tpp = _between(self.tables[key], *_place(tpp, _TPPS))
        low, part = _place(sparsity, _SPARSITIES)
        rows = _between(at_tpp, low, part[:, None])
        above = rows > fdp
        last = len(_RATIOS) - 1 - above[:, ::-1].argmax(axis=1)
        i = np.minimum(last, len(_RATIOS) - 2)
        each = np.arange(len(sparsity))
        here, there = rows[each, i], rows[each, i + 1]
        share = (here - fdp) / np.where(here > there, here - there, 1.0)
        ratio = _RATIOS[i] + np.clip(share, 0.0, 1.0) * (_RATIOS[i + 1] - _RATIOS[i])
        result: Array = np.where(last == len(_RATIOS) - 1, np.inf, ratio)  # past the table
        return result


def contours_from(atlas: Atlas) -> Contours:
    """Tabulate an atlas: about a second."""
    tables = {
        key: np.empty((len(_TPPS), len(_SPARSITIES), len(_RATIOS)), np.float32)
        for key in PENALTIES
    }
    for table in tables.values():
        table[0] = 0.0
        table[:, :, 0] = 1.0 - _SPARSITIES  # without runs every list is picked at random
    for j, eps in enumerate(_SPARSITIES.tolist()):
        for i, delta in enumerate(_RATIOS.tolist()[1:], start=1):
            for key, read in atlas.read_all(_TPPS[1:], delta, eps).items():
                tables[key][1:, j, i] = read
    return Contours(tables)


def _place(value: Array | float, nodes: Array) -> tuple[npt.NDArray[np.int_], Array]:
    """Index of the node before a value, and how far it stands towards the next."""
    i = np.clip(np.searchsorted(nodes, value, side="right") - 1, 0, len(nodes) - 2)
    part: Array = np.clip((value - nodes[i]) / (nodes[i + 1] - nodes[i]), 0.0, 1.0)
    return i, part


def _between(table: npt.NDArray[np.floating], i: npt.NDArray[np.int_], part: Array) -> Array:
    result: Array = table[i] * (1.0 - part) + table[i + 1] * part
    return result
