r"""Columns, loss and response as the solver has them, and the way back.

The solver minimises 1/2 ||y - X b||^2 + sum lambda_i |b|_(i) on columns of length one. Users
state their weights w and read their coefficients in three scalings of the columns and two of
the loss. With columns that are m times those of the solver, coefficients are b / m, and

    lambda = w / m,        with the loss divided by the runs n:   lambda = n w / m.

m = 1 for columns of length one and sqrt(n) for columns of variance one; for columns as given
the solver's have a mean square length of one, and m is the root of theirs.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np

from engine.fit.gram import Matrix
from engine.normal import Array

__all__ = ["COLUMNS", "LOSSES", "Scaled", "scaled", "varying"]

Flags = np.ndarray[Any, np.dtype[np.bool_]]

COLUMNS = ("unit-length", "unit-variance", "as-given")
LOSSES = ("sum", "mean")

# A column whose spread is a smaller share of its largest entry is constant up to rounding.
_CONSTANT = 1e-12


@dataclass(frozen=True, eq=False)
class Scaled:
    """A problem in the solver's units.

    Attributes
    ----------
    X, y : ndarray
        What the solver gets; centred where there is an intercept.
    weight_factor : float
        From the user's weights to the solver's.
    coefficient_factor : float
        From the solver's coefficients to the user's.
    lengths : ndarray
        Length of each of the solver's columns.
    slope_factors : ndarray
        From the solver's coefficients to those per unit of each column as given.
    response_unit : float
        From the solver's response to the user's.
    centre, centres : float, ndarray
        Mean of the response and of each column, as given; zeros without an intercept.
    runs : int
        Dimensions that are left to the response: one less than the rows with an intercept.
    """

    X: Matrix
    y: Array
    weight_factor: float
    coefficient_factor: float
    lengths: Array
    slope_factors: Array
    response_unit: float
    centre: float
    centres: Array
    runs: int


def scaled(X: Matrix, y: Array, columns: str, loss: str, intercept: bool) -> Scaled:
    """Return the problem in the solver's units.

    Raises
    ------
    ValueError
        If a column has no length, or with an intercept is constant.
    """
    n, p = X.shape
    if intercept:
        _refuse_empty(varying(X), "one and the same value")
    # Divided by their largest entries first: no square overflows, none vanishes.
    column_units = np.abs(X).max(axis=0)
    _refuse_empty(column_units > 0.0, "only zeros")
    X = np.asfortranarray(X / column_units)
    centres, centre = np.zeros(p), 0.0
    response_unit = float(np.abs(y).max()) or 1.0
    y = y / response_unit
    if intercept:
        centres, centre = X.mean(axis=0), float(y.mean())
        X -= centres
        y = y - centre if np.ptp(y) > _CONSTANT else np.zeros(n)
    lengths = np.linalg.norm(X, axis=0)
    if columns == "as-given":
        top = float(column_units.max())
        common = float(np.sqrt(np.mean((lengths * (column_units / top)) ** 2)))
        X *= column_units / top / common
        factor, unit = top * common, np.full(p, top * common)
        lengths = lengths * (column_units / top) / common
    else:
        X /= lengths
        factor = 1.0 if columns == "unit-length" else float(np.sqrt(n))
        unit = lengths * column_units
        lengths = np.ones(p)
    return Scaled(
        X=X,
        y=y,
        weight_factor=(n if loss == "mean" else 1.0) / factor / response_unit,
        coefficient_factor=response_unit / factor,
        lengths=lengths,
        slope_factors=response_unit / unit,
        response_unit=response_unit,
        centre=centre * response_unit,
        centres=centres * column_units,
        runs=n - intercept,
    )


def varying(X: Matrix) -> Flags:
    """Whether each column varies, by more than rounding."""
    low, high = X.min(axis=0), X.max(axis=0)
    flags: Flags = high / 2.0 - low / 2.0 > _CONSTANT * np.maximum(-low, high)  # no overflow
    return flags


def _refuse_empty(sound: Flags, what: str) -> None:
    if not sound.all():
        raise ValueError(
            f"X must have columns that vary, not {what} in column {sound.argmin()}"
        )
