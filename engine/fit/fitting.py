"""Sorted-L1 fits for the analysis of a study: lasso, two-level, ramp, or any other weights."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from engine.fit.arguments import (
    GAP,
    check_choice,
    check_design,
    check_flag,
    check_response,
    check_scales,
    check_weights,
)
from engine.fit.prox import Indices, clusters
from engine.fit.scaling import COLUMNS, LOSSES, Scaled, scaled
from engine.fit.solver import Solution, Solver
from engine.normal import Array

__all__ = ["Fit", "fit", "in_given_units", "path"]


@dataclass(frozen=True, eq=False)
class Fit:
    """A sorted-L1 fit and its certificate.

    Attributes
    ----------
    coefficients : ndarray, shape (p,)
        On columns scaled as asked for; zeros and ties are exact.
    slopes : ndarray, shape (p,)
        The same per unit of each column as it was given.
    intercept : float
        `X @ slopes + intercept` is the fitted response; 0 where none was asked for.
    support : ndarray of int
        Selected candidates: those whose coefficient is not zero.
    clusters : ndarray of int, shape (p,)
        0 for a zero; else the rank of the coefficient's size among the distinct ones, 1 for the
        largest.
    gap : float
        Relative duality gap: the objective is within this share of half the squared length of
        the (centred) response from the least one.
    certified : bool
        Whether the gap is at most the one asked for.
    undecided : ndarray of int
        Candidates whose being selected or not is not settled at this gap; mostly empty.
    iterations : int
        Passes over the whole design.
    estimates, correlations : ndarray, shape (p,)
        Coefficients on columns of length one, and the products of these columns with the
        residuals: what `debias` needs.
    residual_norm : float
        Length of the residuals.
    runs : int
        Rows of the design, less one where there is an intercept.
    """

    coefficients: Array
    slopes: Array
    intercept: float
    support: Indices
    clusters: Indices
    gap: float
    certified: bool
    undecided: Indices
    iterations: int
    estimates: Array = field(repr=False)
    correlations: Array = field(repr=False)
    residual_norm: float = field(repr=False)
    runs: int = field(repr=False)


def fit(
    X: Any,
    y: Any,
    weights: Any,
    *,
    columns: str = "unit-length",
    loss: str = "sum",
    intercept: bool = True,
    gap: float = 1e-9,
) -> Fit:
    r"""Fit a linear model with a sorted-L1 penalty, to a certified duality gap.

    Minimises 1/2 ||y - c - X b||^2 + sum_i w_i |b|_(i) over the coefficients b and the
    intercept c, where |b|_(1) >= |b|_(2) >= ... and X has its columns scaled as `columns` says.
    Equal weights give the lasso.

    Parameters
    ----------
    X : array_like, shape (n, p)
        The design, a row a run and a column a candidate.
    y : array_like, shape (n,)
        The response.
    weights : float or array_like, shape (p,)
        Weight of each rank, nonincreasing, at least 0, the first above 0; one number for the
        lasso.
    columns : {'unit-length', 'unit-variance', 'as-given'}
        How the columns are scaled for the weights and the coefficients: to length one; to
        variance one (length sqrt(n)), so that a coefficient is an effect per standard
        deviation; or not at all. With an intercept, lengths are about the mean.
    loss : {'sum', 'mean'}
        1/2 ||y - c - X b||^2, or that divided by n. With columns of unit variance the weights
        of the mean loss are those of unit-length columns and the sum, divided by sqrt(n).
    intercept : bool
        Whether there is one, not penalised.
    gap : float
        Relative duality gap to reach, in (0, 1). The default settles zeros in all but odd
        cases; 1e-6 can leave a wrong entry or two on large problems.

    Returns
    -------
    Fit
        Coefficients, support, clusters and certificate.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Notes
    -----
    A fit can select more candidates than there are runs, but has at most as many distinct
    magnitudes. Where several fits are equally good (copies of a column, say), one of them is
    returned and the candidates concerned may be `undecided`. What the planned TPP and FDP say
    about a fit is asymptotic, for iid Gaussian columns.

    References
    ----------
    .. [1] *SLOPE: adaptive variable selection via convex optimization*, Annals of Applied
       Statistics 9(3), 2015.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.fit import fit
    >>> rng = np.random.default_rng(1)
    >>> X = rng.normal(size=(60, 100))
    >>> y = X[:, 3] - X[:, 70] + 0.5 * rng.normal(size=60)
    >>> lasso = fit(X, y, 0.2, columns="unit-variance", loss="mean")
    >>> lasso.support.tolist(), lasso.certified, lasso.undecided.size
    ([3, 70], True, 0)
    """
    return path(X, y, weights, [1.0], columns=columns, loss=loss, intercept=intercept, gap=gap)[
        0
    ]


def path(
    X: Any,
    y: Any,
    weights: Any,
    scales: Any,
    *,
    columns: str = "unit-length",
    loss: str = "sum",
    intercept: bool = True,
    gap: float = 1e-9,
) -> tuple[Fit, ...]:
    """Fit at several multiples of the weights, each fit started from the one before.

    Parameters
    ----------
    X : array_like, shape (n, p)
        The design, a row a run and a column a candidate.
    y : array_like, shape (n,)
        The response.
    weights : float or array_like, shape (p,)
        Weight of each rank, as for `fit`.
    scales : array_like, shape (m,)
        Factors on the weights, above 0, in any order; they are fitted from the largest down.
    columns : {'unit-length', 'unit-variance', 'as-given'}
        As for `fit`.
    loss : {'sum', 'mean'}
        As for `fit`.
    intercept : bool
        Whether there is one, not penalised.
    gap : float
        Relative duality gap to reach, in (0, 1).

    Returns
    -------
    tuple of Fit
        One fit a scale, in the order of `scales`.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Notes
    -----
    Each is the fit that `fit` gives at `scale * weights`, up to the gap. What the planned TPP
    and FDP say about a fit is asymptotic, for iid Gaussian columns.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.fit import path
    >>> rng = np.random.default_rng(1)
    >>> X = rng.normal(size=(60, 100))
    >>> y = X[:, 3] - X[:, 70] + 0.5 * rng.normal(size=60)
    >>> ramp = np.linspace(1.0, 0.5, 100)
    >>> [found.support.size for found in path(X, y, ramp, [8.0, 4.0, 1.0])]
    [0, 2, 5]
    """
    X = check_design(X)
    y = check_response(y, X.shape[0])
    weights, scales = check_weights(weights, X.shape[1]), check_scales(scales)
    check_choice("columns", columns, COLUMNS)
    check_choice("loss", loss, LOSSES)
    intercept = check_flag("intercept", intercept)
    gap = GAP.check(gap)
    problem = scaled(X, y, columns, loss, intercept)
    solver = Solver(problem.X, problem.y)
    fits: dict[int, Fit] = {}
    for i in np.argsort(-scales).tolist():
        solution = solver.solve(scales[i] * problem.weight_factor * weights, gap)
        fits[i] = in_given_units(solution, problem)
    return tuple(fits[i] for i in range(scales.size))


def in_given_units(solution: Solution, problem: Scaled) -> Fit:
    """Return a solution of the scaled problem as the user reads it."""
    slopes = solution.b * problem.slope_factors
    return Fit(
        coefficients=solution.b * problem.coefficient_factor,
        slopes=slopes,
        intercept=float(problem.centre - problem.centres @ slopes),
        support=np.flatnonzero(solution.b),
        clusters=_ranked(solution.b),
        gap=solution.gap,
        certified=solution.certified,
        undecided=solution.undecided,
        iterations=solution.passes,
        estimates=solution.b * problem.lengths * problem.response_unit,
        correlations=solution.g / problem.lengths * problem.response_unit,
        residual_norm=float(np.linalg.norm(solution.r)) * problem.response_unit,
        runs=problem.runs,
    )


def _ranked(b: Array) -> Indices:
    found = clusters(b)
    ranks = np.zeros(b.size, dtype=np.intp)
    ranks[found.members] = np.repeat(np.arange(1, found.starts.size + 1), found.sizes)
    return ranks
