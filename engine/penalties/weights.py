"""The user's own weights: a list of any length, read by rank."""

import csv
import json
import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from engine.files import check_list
from engine.normal import Array
from engine.penalties.penalty import Law, Shape
from engine.penalties.profile import profile_shape
from engine.quantities import WEIGHT, shown

__all__ = ["MOST_WEIGHTS", "Weights", "check_weights", "load_weights"]

MOST_WEIGHTS = 1_000_000
_BYTES = 30_000_000


@dataclass(frozen=True)
class Weights:
    """Nonincreasing weights; a list shorter or longer than the ranks is resampled by rank."""

    values: tuple[float, ...]
    key: str = "weights"

    def shape(self, threshold: float, law: Law) -> Shape:
        """Return the shrinkage with this zero threshold."""
        return profile_shape(
            threshold, law, self._at, lambda ranks, p: self._at((ranks - 0.5) / p)
        )

    def _at(self, shares: Array) -> Array:
        values = np.array(self.values)
        at: Array = np.interp(shares, (np.arange(values.size) + 0.5) / values.size, values)
        return at


def check_weights(data: Any, where: str = "weights") -> tuple[float, ...]:
    """Return a list of weights, checked.

    Raises
    ------
    ValueError
        Names the entry, the rule and the value.

    Examples
    --------
    >>> from engine.penalties.weights import check_weights
    >>> check_weights([3, 2, 0.5])
    (3.0, 2.0, 0.5)
    """
    entries = data.tolist() if isinstance(data, np.ndarray) else data
    entries = list(entries) if isinstance(entries, tuple) else entries
    entries = check_list(entries, where, 1, MOST_WEIGHTS)
    values = tuple(WEIGHT.check(entry, f"{where}[{i}]") for i, entry in enumerate(entries))
    if values[0] <= 0.0:
        raise ValueError(f"{where}[0] must be a finite number above 0, not {shown(values[0])}")
    rises = np.flatnonzero(np.diff(values) > 0.0)
    if rises.size:
        i = int(rises[0]) + 1
        raise ValueError(
            f"{where}[{i}] must be at most the entry before, not {shown(values[i])}"
        )
    return values


def load_weights(content: bytes | str) -> tuple[float, ...]:
    """Return the weights in a file's content: a JSON list, or numbers split by commas or lines.

    Raises
    ------
    ValueError
        Names the entry, the rule and the value.

    Examples
    --------
    >>> from engine.penalties.weights import load_weights
    >>> load_weights("3, 2, 0.5"), load_weights("[3, 2, 0.5]")
    ((3.0, 2.0, 0.5), (3.0, 2.0, 0.5))
    """
    if len(content) > _BYTES:
        raise ValueError(f"weights must be at most {_BYTES:,} bytes, not {len(content):,}")
    try:
        text = content.decode("utf-8-sig") if isinstance(content, bytes) else content
    except UnicodeDecodeError as error:
        raise ValueError(
            f"weights must be UTF-8, not other bytes (at byte {error.start})"
        ) from None
    if text.lstrip().startswith("["):
        try:
            return check_weights(json.loads(text))
        except (json.JSONDecodeError, RecursionError):
            raise ValueError("weights must be a JSON list of numbers") from None
    cells = [cell.strip() for row in csv.reader(text.splitlines()) for cell in row]
    return check_weights([_number(cell) for cell in cells if cell])


def _number(cell: str) -> float | str:
    try:
        number = float(cell) if "_" not in cell else math.nan
    except ValueError:
        return cell
    return number if math.isfinite(number) else cell
