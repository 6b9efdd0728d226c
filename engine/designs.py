"""Random designs for rehearsals: iid columns of several laws, correlated ones, or your own.

Every column is drawn from a law of mean 0 and variance 1, so that an effect is one per standard
deviation. The theory is for the Gaussian design; the others show how far it carries.
"""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from scipy.signal import lfilter

from engine.fit.arguments import check_choice, check_design, check_flag
from engine.fit.gram import Matrix
from engine.quantities import Quantity, shown

__all__ = ["KINDS", "Design", "design_of"]

KINDS = ("gaussian", "rademacher", "counts", "heavy", "ar1", "blocks", "own")

AR1_CORRELATION = Quantity(
    "correlation", "Correlation", "r", "",
    "Correlation of neighbouring columns",
    -1.0, 1.0, low_open=True, high_open=True,
)  # fmt: skip
BLOCK_CORRELATION = Quantity(
    "correlation", "Correlation", "r", "",
    "Correlation of the columns of a block",
    0.0, 1.0, high_open=True,
)  # fmt: skip

_BLOCK = 10  # columns of a block
# Ones and twos among counts: about those of two draws of chance 0.1.
_FREQUENCIES = (0.18, 0.01)
_HEAVY_DF = 5


@dataclass(frozen=True, eq=False)
class Design:
    """How the columns of a rehearsed study are drawn; `design_of` builds and checks it.

    Attributes
    ----------
    kind : str
        One of `KINDS`.
    correlation : float
        Of neighbouring columns ('ar1'), or of those of a block of ten ('blocks').
    frequencies : tuple of float
        Share of ones and of twos among 'counts'; the rest is zero.
    matrix : ndarray or None
        Your 'own' design, its columns standardised.
    resample : bool
        Whether each replicate draws its runs from the rows of `matrix`, with replacement, or
        takes them as they are.
    """

    kind: str
    correlation: float = 0.0
    frequencies: tuple[float, float] = _FREQUENCIES
    matrix: Matrix | None = field(default=None, repr=False)
    resample: bool = True

    def draw(self, runs: int, candidates: int, rng: np.random.Generator) -> Matrix:
        """Return a design whose columns have mean 0 and variance 1 in their law."""
        if self.matrix is not None:
            rows = (
                rng.integers(self.matrix.shape[0], size=runs) if self.resample else slice(None)
            )
            return self.matrix[rows]
        shape = (runs, candidates)
        X: Matrix
        if self.kind == "rademacher":
            X = rng.choice((-1.0, 1.0), size=shape)
        elif self.kind == "counts":
            X = self._counts(rng.random(shape))
        elif self.kind == "heavy":
            X = rng.standard_t(_HEAVY_DF, size=shape)
            X /= np.sqrt(_HEAVY_DF / (_HEAVY_DF - 2.0))
        else:
            X = self._correlated(rng.standard_normal(shape), rng)
        return X

    def _correlated(self, X: Matrix, rng: np.random.Generator) -> Matrix:
        r = self.correlation
        if self.kind == "ar1":
            X[:, 1:] *= np.sqrt(1.0 - r * r)
            X = lfilter([1.0], [1.0, -r], X, axis=1)
        elif self.kind == "blocks":
            runs, candidates = X.shape
            shared = rng.standard_normal((runs, -(-candidates // _BLOCK)))
            X *= np.sqrt(1.0 - r)
            X += np.sqrt(r) * np.repeat(shared, _BLOCK, axis=1)[:, :candidates]
        return X

    def _counts(self, uniform: Matrix) -> Matrix:
        ones, twos = self.frequencies
        counts: Matrix = (uniform < ones + twos).astype(np.float64) + (uniform < twos)
        mean = ones + 2.0 * twos
        counts -= mean
        counts /= np.sqrt(ones + 4.0 * twos - mean * mean)
        return counts


def design_of(
    kind: str = "gaussian",
    *,
    correlation: Any = None,
    frequencies: Any = None,
    matrix: Any = None,
    resample: bool = True,
) -> Design:
    """Return a checked design.

    Parameters
    ----------
    kind : {'gaussian', 'rademacher', 'counts', 'heavy', 'ar1', 'blocks', 'own'}
        Law of the columns: iid normal, random signs, sparse counts of 0, 1 and 2, Student's t
        with 5 degrees of freedom; an autoregression along the columns, blocks of ten equally
        correlated columns; or a matrix of your own.
    correlation : float, optional
        For 'ar1' in (-1, 1), for 'blocks' in [0, 1); needed by these two only.
    frequencies : tuple of float, optional
        For 'counts': shares of ones and of twos, together in (0, 1); by default 0.18 and 0.01.
    matrix : array_like, shape (rows, candidates), optional
        For 'own': its columns are centred and scaled to variance one.
    resample : bool
        For 'own': whether each replicate draws its runs from the rows, with replacement, or
        takes them as they are.

    Returns
    -------
    Design
        Draws a new design for every replicate.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Examples
    --------
    >>> import numpy as np
    >>> from engine.designs import design_of
    >>> X = design_of("ar1", correlation=0.5).draw(2000, 4, np.random.default_rng(0))
    >>> X.shape, np.corrcoef(X.T)[0].round(1).tolist()
    ((2000, 4), [1.0, 0.5, 0.3, 0.1])
    """
    check_choice("kind", kind, KINDS)
    resample = check_flag("resample", resample)
    _only_for("correlation", correlation, kind, ("ar1", "blocks"))
    _only_for("frequencies", frequencies, kind, ("counts",), needed=False)
    _only_for("matrix", matrix, kind, ("own",))
    if kind == "ar1":
        return Design(kind, correlation=AR1_CORRELATION.check(correlation))
    if kind == "blocks":
        return Design(kind, correlation=BLOCK_CORRELATION.check(correlation))
    if kind == "counts" and frequencies is not None:
        return Design(kind, frequencies=_checked_frequencies(frequencies))
    if kind == "own":
        return Design(
            kind, matrix=_standardised(check_design(matrix, "matrix")), resample=resample
        )
    return Design(kind)


def _only_for(
    name: str, value: Any, kind: str, kinds: tuple[str, ...], needed: bool = True
) -> None:
    if kind in kinds and needed and value is None:
        raise ValueError(f"{name} must be given for the design {kind!r}, not None")
    if kind not in kinds and value is not None:
        raise ValueError(f"{name} must be left out for the design {kind!r}, not {shown(value)}")


def _checked_frequencies(frequencies: Any) -> tuple[float, float]:
    rule = "frequencies must be two numbers at least 0 that sum to more than 0 and less than 1"
    try:
        ones, twos = (float(value) for value in frequencies)
    except (TypeError, ValueError):
        raise ValueError(f"{rule}, not {shown(frequencies)}") from None
    if not (ones >= 0.0 and twos >= 0.0 and 0.0 < ones + twos < 1.0):
        raise ValueError(f"{rule}, not {shown(frequencies)}")
    return ones, twos


def _standardised(matrix: Matrix) -> Matrix:
    units = np.abs(matrix).max(axis=0)  # no square overflows
    matrix = matrix / np.where(units > 0.0, units, 1.0)
    matrix -= matrix.mean(axis=0)
    spreads = matrix.std(axis=0)
    constant = np.flatnonzero(spreads <= 1e-12)  # rounding leaves some 1e-16
    if constant.size:
        raise ValueError(
            f"matrix must have columns that vary, not one and the same value in column "
            f"{constant[0]}"
        )
    matrix /= spreads
    return matrix
