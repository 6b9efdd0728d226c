r"""Two-stage selection: debias a fit, then cut the debiased estimates.

Source: *Which bridge estimator is the best for variable selection?*, Annals of Statistics
48(5), 2020 (formulas from memory, verified by simulation). On columns of length one, with n
runs, r the residuals and df the number of distinct nonzero magnitudes (the lasso: nonzeros),

    estimate = b + X'r / (1 - df/n),       tau = ||r|| / (sqrt(n) (1 - df/n)),

and estimate / tau is about normal, around the effect in units of tau, with variance one.
With an intercept, n is one less than the rows: a rotation that sets the mean apart leaves a
study of n - 1 runs without one (*derived here*).
"""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from scipy.special import ndtri

from engine.fit.fitting import Fit
from engine.fit.prox import Indices
from engine.normal import Array
from engine.quantities import FDP, ZERO_THRESHOLD, shown

__all__ = ["Cut", "Debiased", "cut", "debias", "debiased_z", "selected_at_level"]

# Simulated at a share of .93, the estimate of tau had a standard deviation of .7 on 3.8.
_UNSTABLE = 0.9


@dataclass(frozen=True, eq=False)
class Debiased:
    """Debiased estimates of a fit, zeros included.

    Attributes
    ----------
    z : ndarray, shape (p,)
        Estimates in units of tau: about normal with variance one, around 0 for a null.
    tau : float
        Effective noise, in the response's unit, on columns of length one.
    df : int
        Distinct nonzero magnitudes of the fit.
    df_per_run : float
        df / n.
    caution : str
        Why tau is not to be relied on; empty where it is.
    """

    z: Array = field(repr=False)
    tau: float
    df: int
    df_per_run: float
    caution: str


@dataclass(frozen=True, eq=False)
class Cut:
    """The list left by a cut: the candidates selected, and the size of z they had to pass."""

    selected: Indices
    threshold: float


def debias(fit: Fit) -> Debiased:
    """Debias a fit, for `cut`.

    Parameters
    ----------
    fit : Fit
        What `fit` or `path` returned; the planned strength is that of the smallest tau.

    Returns
    -------
    Debiased
        z-scores of all candidates, and their noise.

    Raises
    ------
    ValueError
        If `fit` is none, or has as many distinct magnitudes as runs: nothing is left to debias
        it with.

    Notes
    -----
    Asymptotic, for iid Gaussian columns.

    References
    ----------
    .. [1] *Which bridge estimator is the best for variable selection?*, Annals of Statistics
       48(5), 2020.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.fit import cut, debias, fit
    >>> rng = np.random.default_rng(1)
    >>> X = rng.normal(size=(60, 100))
    >>> y = X[:, 3] - X[:, 70] + 0.5 * rng.normal(size=60)
    >>> debiased = debias(fit(X, y, 2.0))
    >>> cut(debiased, level=0.1).selected.tolist(), cut(debiased, threshold=4).selected.tolist()
    ([3, 70], [3, 70])
    """
    if not isinstance(fit, Fit):
        raise ValueError(f"fit must be what fit or path returned, not {shown(fit)}")
    df = int(fit.clusters.max())
    if df >= fit.runs:
        raise ValueError(
            f"fit must have fewer distinct magnitudes than runs to be debiased, "
            f"not {df} with {fit.runs} runs"
        )
    z, tau = debiased_z(fit.estimates, fit.correlations, fit.residual_norm, df, fit.runs)
    share = df / fit.runs
    caution = ""
    if share > _UNSTABLE:
        caution = f"tau is unstable: {df} distinct magnitudes in a fit to {fit.runs} runs"
    elif tau == 0.0:
        caution = "tau is 0: the fit leaves no residuals"
    return Debiased(z, tau, df, share, caution)


def cut(debiased: Debiased, *, threshold: Any = None, level: Any = None) -> Cut:
    """Select candidates by their debiased z-scores.

    Parameters
    ----------
    debiased : Debiased
        What `debias` returned.
    threshold : float, optional
        Select |z| above this; at least 0.
    level : float, optional
        Instead of a threshold: select by the Benjamini-Hochberg procedure at this level, in
        (0, 1), over all candidates. The expected FDP is then (1 - sparsity) times the level.

    Returns
    -------
    Cut
        Selected candidates and the threshold used.

    Raises
    ------
    ValueError
        If not exactly one of threshold and level is given, or one is outside its interval.

    Notes
    -----
    Asymptotic, for iid Gaussian columns; z-scores of correlated columns are not independent.

    References
    ----------
    .. [1] *Controlling the false discovery rate: a practical and powerful approach to multiple
       testing*, Journal of the Royal Statistical Society B 57(1), 1995.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.fit.two_stage import Debiased, cut
    >>> scores = Debiased(np.array([3.0, -0.5, -2.5, 1.9]), 1.0, 0, 0.0, "")
    >>> cut(scores, threshold=2.0).selected.tolist()
    [0, 2]
    >>> cut(scores, level=0.1).selected.tolist()
    [0, 2, 3]
    """
    if not isinstance(debiased, Debiased):
        raise ValueError(f"debiased must be what debias returned, not {shown(debiased)}")
    if (threshold is None) == (level is None):
        given = "neither" if threshold is None else "both"
        raise ValueError(f"cut must have either a threshold or a level, not {given}")
    sizes = np.abs(debiased.z)
    if level is None:
        least = ZERO_THRESHOLD.check(threshold, "threshold")
        return Cut(np.flatnonzero(sizes > least), least)
    return selected_at_level(sizes, FDP.check(level, "level"))


def debiased_z(
    estimates: Array, correlations: Array, residual_norm: float, df: int, runs: int
) -> tuple[Array, float]:
    """Return the z-scores and tau of a fit on columns of length one, with df below the runs."""
    left = 1.0 - df / runs
    tau = residual_norm / (np.sqrt(runs) * left)
    with np.errstate(divide="ignore", invalid="ignore"):
        z = (estimates + correlations / left) / tau
    return np.nan_to_num(z, nan=0.0, posinf=np.inf, neginf=-np.inf), float(tau)


def selected_at_level(sizes: Array, level: float) -> Cut:
    """Benjamini-Hochberg selection by two-sided z-scores of these sizes."""
    p = sizes.size
    critical = -ndtri(level * np.arange(1, p + 1) / (2 * p))
    passing = np.flatnonzero(np.sort(sizes)[::-1] >= critical)
    # Where none passes, the largest score had to pass the first critical value.
    threshold = float(critical[passing[-1] if passing.size else 0])
    return Cut(np.flatnonzero(sizes >= threshold), threshold)
