"""The one boundary where arrays of numbers handed to the engine are checked.

Everything below this module trusts what it is given.
"""

from typing import Any

import numpy as np

from engine.normal import Array
from engine.quantities import Quantity, shown

__all__ = ["as_given", "check_arrays"]


def check_arrays(*pairs: tuple[Quantity, Any]) -> tuple[Array, ...]:
    """Return the value of each (quantity, value) pair, checked, broadcast to a common shape.

    Raises
    ------
    ValueError
        Names the argument, the rule and the first offending value.
    """
    arrays = [_check(quantity, value) for quantity, value in pairs]
    try:
        return tuple(np.broadcast_arrays(*arrays))
    except ValueError:
        shapes = ", ".join(
            f"{quantity.name} {array.shape}"
            for (quantity, _), array in zip(pairs, arrays, strict=True)
        )
        raise ValueError(f"arguments must have shapes that broadcast, not {shapes}") from None


def as_given(result: Array) -> Any:
    """Return a 0-d `result` as a float, any other as it is."""
    return float(result) if result.ndim == 0 else result


def _check(quantity: Quantity, value: Any) -> Array:
    try:
        array = np.asarray(value)
    except ValueError:  # ragged nesting
        array = np.asarray(None)
    if array.dtype.kind not in "iuf":
        raise ValueError(f"{quantity.name} must be {quantity.rule}, not {shown(value)}")
    with np.errstate(over="ignore"):  # a long double beyond every float is refused as infinite
        array = array.astype(np.float64)
    bad = ~quantity.admits(array)
    if bad.any():
        raise ValueError(f"{quantity.name} must be {quantity.rule}, not {shown(array[bad][0])}")
    return array
