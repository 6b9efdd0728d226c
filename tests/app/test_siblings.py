"""Neighbouring studies: the right curves, and the fact that the picture is there for."""

import numpy as np
import pytest

from app.ready import ready_atlas
from app.siblings import RATIOS, SPARSITIES, siblings
from engine import sorted_l1_boundary


def test_they_are_the_boundaries_of_their_studies():
    found = siblings(0.3, 0.2, ready_atlas())
    at = np.array([12, 24, 36])  # TPP 0.25, 0.5, 0.75
    for value, curve in zip(SPARSITIES, found.by_sparsity, strict=True):
        exact = sorted_l1_boundary(found.tpp[at], 0.3, value)
        assert curve[at] == pytest.approx(exact, abs=2e-3)  # what the atlas strays
    for value, curve in zip(RATIOS, found.by_ratio, strict=True):
        exact = sorted_l1_boundary(found.tpp[at], value, 0.2)
        assert curve[at] == pytest.approx(exact, abs=2e-3)


def test_sorted_l1_is_not_monotone_in_sparsity():
    """At a fixed ratio the curves cross (common practice, no source); more runs never hurt."""
    found = siblings(0.3, 0.2, ready_atlas())
    inner = slice(1, -1)
    rises = np.diff(np.array(found.by_sparsity)[:, inner], axis=0)
    assert rises.min() < -0.05
    assert rises.max() > 0.05
    assert np.diff(np.array(found.by_ratio)[:, inner], axis=0).max() <= 2e-3
