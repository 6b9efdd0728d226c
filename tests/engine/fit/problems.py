"""Small studies for the tests of fits."""

import numpy as np
from scipy.special import ndtri

__all__ = ["DESIGNS", "WEIGHTS", "design", "study", "weights_of"]

DESIGNS = ("gaussian", "rademacher", "heavy", "counts", "ar1", "blocks")
WEIGHTS = ("lasso", "two-level", "ramp")


def design(kind, runs, candidates, rng):
    """Columns of length one, of several kinds; those without any variation stay zero."""
    X = rng.normal(size=(runs, candidates))
    if kind == "rademacher":
        X = np.sign(X)
    elif kind == "heavy":
        X = rng.standard_t(3, size=X.shape)
    elif kind == "counts":
        X = rng.binomial(2, 0.05, size=X.shape).astype(float)
        X -= X.mean(axis=0)
    elif kind == "ar1":
        for j in range(1, candidates):
            X[:, j] = 0.9 * X[:, j - 1] + np.sqrt(0.19) * X[:, j]
    elif kind == "blocks":
        shared = np.repeat(rng.normal(size=(runs, -(-candidates // 10))), 10, axis=1)
        X = np.sqrt(0.1) * X + np.sqrt(0.9) * shared[:, :candidates]
    lengths = np.linalg.norm(X, axis=0)
    return X / np.where(lengths > 0.0, lengths, 1.0)


def study(runs, candidates, seed=0, kind="gaussian"):
    """Return X, y: a tenth of the candidates has effect 4, noise has SD 1."""
    rng = np.random.default_rng(seed)
    X = design(kind, runs, candidates, rng)
    effects = np.zeros(candidates)
    effects[rng.permutation(candidates)[: max(1, candidates // 10)]] = 4.0
    return X, X @ effects + rng.normal(size=runs)


def weights_of(kind, candidates):
    """Weights whose largest is 1."""
    ranks = np.arange(1, candidates + 1)
    if kind == "lasso":
        return np.ones(candidates)
    if kind == "two-level":
        return np.where(ranks <= 0.2 * candidates, 1.0, 0.5)
    ramp = ndtri(1.0 - 0.1 * ranks / (2 * candidates))
    return ramp / ramp[0]
