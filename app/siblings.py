"""Sorted L1 on studies that share the sampling ratio, or the sparsity, of the user's."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from engine.limits.atlas import Atlas
from engine.normal import Array

__all__ = ["RATIOS", "SPARSITIES", "Siblings", "siblings"]

SPARSITIES = (0.05, 0.1, 0.2, 0.35, 0.5)
RATIOS = (0.1, 0.2, 0.3, 0.5, 0.8)

_TPP = np.linspace(0.0, 1.0, 49)


@dataclass(frozen=True)
class Siblings:
    """Boundaries along `tpp`, in the order of `SPARSITIES` and of `RATIOS`."""

    tpp: Array
    by_sparsity: tuple[Array, ...]
    by_ratio: tuple[Array, ...]


def siblings(sampling_ratio: float, sparsity: float, atlas: Atlas) -> Siblings:
    """Read the boundaries of sorted L1 off the atlas, for drawing."""

    return Siblings(_TPP, _by_sparsity(sampling_ratio, atlas), _by_ratio(sparsity, atlas))


# Where only one of the two ratios moves, the other family stays as it is.
@lru_cache(maxsize=8)
def _by_sparsity(sampling_ratio: float, atlas: Atlas) -> tuple[Array, ...]:
    return tuple(_along(sampling_ratio, eps, atlas) for eps in SPARSITIES)


@lru_cache(maxsize=8)
def _by_ratio(sparsity: float, atlas: Atlas) -> tuple[Array, ...]:
    return tuple(_along(delta, sparsity, atlas) for delta in RATIOS)


def _along(delta: float, eps: float, atlas: Atlas) -> Array:
    return atlas.read("sorted-l1", _TPP, delta, eps)
