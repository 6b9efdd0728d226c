"""The normalised signal of a study: what the theory knows of it.

Columns have length one in the limit, so that an effect b per standard deviation becomes
b sqrt(runs): more runs raise both the sampling ratio and the normalised effects.
"""

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from engine.normal import Array
from engine.study import Effect, Spread, Study

__all__ = ["SignalLaw", "signal_law"]

# Largest size kept of a spread, in units of its scale: 1e-15 of a normal law and 2e-9 of an
# exponential one lie beyond.
_REACH = {"normal": 8.0, "exponential": 20.0}


@dataclass(frozen=True, eq=False)
class SignalLaw:
    """The law of the coefficients on columns of length one, and the noise.

    Attributes
    ----------
    delta, eps : float
        Sampling ratio and sparsity.
    noise : float
        Standard deviation of the noise.
    sizes, masses : ndarray, shape (atoms,)
        Nonzero sizes b sqrt(runs), in the response's unit, and the share of the candidates
        at each; the shares sum to eps.
    groups : tuple of slice
        Atoms of each effect of the study.
    """

    delta: float
    eps: float
    noise: float
    sizes: Array
    masses: Array
    groups: tuple[slice, ...]

    @property
    def energy(self) -> float:
        """Mean squared coefficient of a candidate."""
        return float(self.masses @ self.sizes**2)


def signal_law(study: Study) -> SignalLaw:
    """Return the normalised law of a study; spreads become atoms by quadrature.

    Asymptotic, for iid Gaussian columns.

    Examples
    --------
    >>> from engine.demo import DEMO_STUDY
    >>> from engine.signal import signal_law
    >>> law = signal_law(DEMO_STUDY)
    >>> law.sizes.round(3).tolist(), law.masses.round(3).tolist()
    ([3.919, 7.838], [0.12, 0.08])
    """
    growth = math.sqrt(study.runs)
    parts = [_atoms(effect, growth, study.noise_sd) for effect in study.effects]
    ends = np.cumsum([0] + [len(sizes) for sizes, _ in parts]).tolist()
    return SignalLaw(
        delta=study.sampling_ratio,
        eps=study.sparsity,
        noise=study.noise_sd,
        sizes=np.concatenate([sizes for sizes, _ in parts]),
        masses=study.sparsity * np.concatenate([shares for _, shares in parts]),
        groups=tuple(slice(a, b) for a, b in pairwise(ends)),
    )


def _atoms(effect: Effect | Spread, growth: float, noise: float) -> tuple[Array, Array]:
    if isinstance(effect, Effect):
        return np.array([abs(effect.size) * growth]), np.array([effect.share])
    scale = effect.scale * growth
    # What is integrated changes over lengths of tau >= noise, and thresholds are at most some
    # six tau: nodes may thin out in proportion to the size (x = unit sinh v).
    unit = min(4.0 * noise, 5.0 * scale)
    end = math.asinh(_REACH[effect.spread] * scale / unit)
    v, widths = np.polynomial.legendre.leggauss(math.ceil(9.0 * end) + 12)
    v = 0.5 * end * (v + 1.0)
    sizes = unit * np.sinh(v)
    ratio = sizes / scale
    density = np.exp(-0.5 * ratio**2 if effect.spread == "normal" else -ratio)
    shares = density * np.cosh(v) * widths
    kept = shares > 0.0
    return sizes[kept], effect.share * shares[kept] / shares.sum()
