"""The working set: the columns met so far, their Gram matrix and products with the response.

Only the rows of new columns are computed. Buffers grow by doubling; they are sized by the
columns met, which for sorted L1 can be more than the runs.
"""

import numpy as np

from engine.fit.prox import Indices
from engine.normal import Array

__all__ = ["WorkingSet"]

Matrix = np.ndarray[tuple[int, int], np.dtype[np.float64]]


class WorkingSet:
    """Columns of a design, in the order in which they were added."""

    def __init__(self, X: Matrix, y: Array) -> None:
        self._X = X
        self._y = y
        self._held = np.zeros(X.shape[1], dtype=bool)
        self._columns = np.empty((X.shape[0], 0), order="F")
        self._gram = np.empty((0, 0))
        self._norm_guess = np.empty(0)
        self.indices: Indices = np.empty(0, dtype=np.intp)
        self.c = np.empty(0)  # X_W' y
        self.norm = 0.0  # largest eigenvalue of the Gram matrix, up to a few percent

    @property
    def gram(self) -> Matrix:
        """X_W' X_W, as a view."""
        m = self.indices.size
        return self._gram[:m, :m]

    @property
    def columns(self) -> Matrix:
        """X_W, as a view."""
        return self._columns[:, : self.indices.size]

    def lacks(self, candidates: Indices) -> Indices:
        """Those of `candidates` that are not in the set."""
        return candidates[~self._held[candidates]]

    def add(self, new: Indices) -> None:
        """Add columns that are not in the set."""
        old, m = self.indices.size, self.indices.size + new.size
        self._make_room(m)
        self._columns[:, old:m] = self._X[:, new]
        rows = self._columns[:, old:m].T @ self._columns[:, :m]
        self._gram[old:m, :m] = rows
        self._gram[:old, old:m] = rows[:, :old].T
        self._held[new] = True
        self.indices = np.concatenate([self.indices, new])
        self.c = np.concatenate([self.c, self._columns[:, old:m].T @ self._y])
        self._measure()

    def _make_room(self, m: int) -> None:
        room = self._gram.shape[0]
        if m <= room:
            return
        old, room = self.indices.size, min(self._held.size, max(m, 2 * room))
        columns = np.empty((self._X.shape[0], room), order="F")
        columns[:, :old] = self.columns
        gram = np.empty((room, room))
        gram[:old, :old] = self.gram
        self._columns, self._gram = columns, gram

    def _measure(self) -> None:
        """Bring `norm` up to date by power iteration from the last eigenvector."""
        m = self.indices.size
        v = np.full(m, 1.0 / np.sqrt(m))
        v[: self._norm_guess.size] += self._norm_guess
        for _ in range(8):
            v /= np.linalg.norm(v)
            v = self.gram @ v
        self.norm = max(self.norm, float(np.linalg.norm(v)))
        self._norm_guess = v / np.linalg.norm(v)
