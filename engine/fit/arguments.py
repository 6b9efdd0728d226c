"""The boundary where designs, responses and weights are checked; below it they are trusted."""

from typing import Any

import numpy as np

from engine.fit.gram import Matrix
from engine.normal import Array
from engine.quantities import Quantity, shown

__all__ = [
    "GAP",
    "check_choice",
    "check_design",
    "check_flag",
    "check_response",
    "check_scales",
    "check_weights",
]

GAP = Quantity(
    "gap", "Gap", "", "share of half the squared length of the response",
    "Relative duality gap that a fit must reach to be certified",
    0.0, 1.0, low_open=True, high_open=True,
)  # fmt: skip


def check_design(X: Any, name: str = "X") -> Matrix:
    """Return the design, called `name`, as a matrix of floats."""
    rule = (
        f"{name} must be a matrix of finite numbers, a row a run and a column a candidate, not "
    )
    array = _numbers(X, rule)
    if array.ndim != 2 or array.size == 0:
        raise ValueError(f"{rule}one of shape {array.shape}")
    _refuse(array, ~np.isfinite(array), rule)
    return array


def check_response(y: Any, runs: int) -> Array:
    """Return the response as an array of floats, one a run."""
    rule = f"y must be {runs} finite numbers, one a row of X, not "
    array = _numbers(y, rule)
    if array.shape != (runs,):
        raise ValueError(f"{rule}an array of shape {array.shape}")
    _refuse(array, ~np.isfinite(array), rule)
    return array


def check_weights(weights: Any, candidates: int) -> Array:
    """Return the weights, one a rank: nonincreasing, at least 0, the first above 0."""
    rule = f"weights must be one number or {candidates}, one a column of X, not "
    array = _numbers(weights, rule)
    if array.shape not in ((), (candidates,)):
        raise ValueError(f"{rule}an array of shape {array.shape}")
    array = np.array(np.broadcast_to(array, candidates))
    rule = "weights must be finite numbers at least 0, not "
    _refuse(array, ~(np.isfinite(array) & (array >= 0.0)), rule)
    if array[0] == 0.0:
        raise ValueError("weights must begin above 0, not 0")
    rises = np.flatnonzero(np.diff(array) > 0.0)
    if rises.size:
        before, after = array[rises[0]], array[rises[0] + 1]
        raise ValueError(
            f"weights must not rise from one rank to the next, not {shown(before)}, "
            f"{shown(after)} at ranks {rises[0] + 1}, {rises[0] + 2}"
        )
    return array


def check_scales(scales: Any) -> Array:
    """Return the factors on the weights, as an array of floats above 0."""
    rule = "scales must be a list of finite numbers above 0, not "
    array = _numbers(scales, rule)
    if array.ndim != 1:
        raise ValueError(f"{rule}an array of shape {array.shape}")
    _refuse(array, ~(np.isfinite(array) & (array > 0.0)), rule)
    return array


def check_choice(name: str, value: Any, choices: tuple[str, ...]) -> str:
    """Return the value where it is one of `choices`."""
    if not isinstance(value, str) or value not in choices:
        listed = " or ".join(map(repr, choices))
        raise ValueError(f"{name} must be {listed}, not {shown(value)}")
    return value


def check_flag(name: str, value: Any) -> bool:
    """Return the value where it is a truth value."""
    if not isinstance(value, bool | np.bool_):
        raise ValueError(f"{name} must be True or False, not {shown(value)}")
    return bool(value)


def _numbers(value: Any, rule: str) -> Array:
    try:
        array = np.asarray(value)
    except ValueError:  # ragged nesting
        array = np.asarray(None)
    if array.dtype.kind not in "iuf":
        raise ValueError(rule + shown(value))
    with np.errstate(over="ignore"):  # a long double beyond every float is refused as infinite
        return array.astype(np.float64)


def _refuse(array: Array, bad: "np.ndarray[Any, np.dtype[np.bool_]]", rule: str) -> None:
    if bad.any():
        place = np.argwhere(bad)[0]
        where = f" at {tuple(place.tolist())}" if array.ndim > 1 else f" at {place[0]}"
        raise ValueError(f"{rule}{shown(array[tuple(place)])}{where}")
