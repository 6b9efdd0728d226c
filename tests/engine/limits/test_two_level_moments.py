"""Two-level moments against quadrature, their limits, and the share that makes a shrinkage."""

import math
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import norm

from engine.limits.two_level_moments import (
    Pieces,
    null_risk_and_slope,
    risk_and_slope,
    selected,
)
from engine.limits.witness import Law


def eta(x, b, gap, h):
    """The two-level shrinkage, written from its definition."""
    y = np.abs(x)
    flat = np.where(y <= b + h, y - b, h)
    return np.sign(x) * np.where(y <= b, 0.0, np.where(y <= b + gap + h, flat, y - b - gap))


def by_quadrature(t, b, gap, h):
    ends = sorted({-12.0, 12.0, *(s * k - t for s in (1, -1) for k in (b, b + h, b + gap + h))})
    ends = [z for z in ends if -12.0 <= z <= 12.0]

    def moment(f):
        return sum(quad(lambda z: f(z) * norm.pdf(z), *pair)[0] for pair in pairwise(ends))

    def slope(z):
        y = abs(t + z)
        return float((b < y < b + h) or y > b + gap + h)

    return moment(lambda z: (eta(t + z, b, gap, h) - t) ** 2), moment(slope)


@pytest.mark.parametrize(
    ("t", "b", "gap", "h"),
    [
        (0.0, 1.0, 0.7, 0.4), (1.4, 1.2, 1.1, 0.8), (3.0, 0.2, 2.0, 2.5),
        (0.5, 0.0, 0.3, 0.1), (2.0, 1.5, 8.0, 2.0),
    ],
)  # fmt: skip
def test_moments_against_quadrature(t, b, gap, h):
    values = risk_and_slope(*(np.array(v) for v in (t, b, gap, h)))
    assert values == pytest.approx(by_quadrature(t, b, gap, h), abs=1e-8)
    assert selected(np.array(t), np.array(b)) == pytest.approx(
        norm.sf(b - t) + norm.cdf(-b - t)
    )


def test_null_moments_are_those_at_0():
    b, gap, h = (np.array(v) for v in (0.8, 1.2, 0.5))
    both = zip(
        null_risk_and_slope(b, gap, h), risk_and_slope(np.zeros(()), b, gap, h), strict=True
    )
    for one, other in both:
        assert one == pytest.approx(other, abs=1e-15)


LAWS = (
    (Pieces(1.1, 0.9, 0.6), Law((1.5,), (1.0,))),
    (Pieces(0.4, 1.8, 1.2), Law((0.0, 2.2), (0.3, 0.7))),
    (Pieces(1.7, 0.3, 0.1), Law((0.0, 3.0), (0.2, 0.8))),
)


@pytest.mark.parametrize(("pieces", "law"), LAWS)
def test_a_law_has_the_mean_of_its_moments(pieces, law):
    shape = (pieces.b, pieces.gap, pieces.h)
    parts = [by_quadrature(size, *shape) for size in (0.0, *law.sizes)]
    shares = (0.8, *(0.2 * share for share in law.shares))
    # 1e-7: quad stops at 1.5e-8 on each of a few stretches.
    for k, moment in enumerate(pieces.risk_and_slope_of(law, 0.2)):
        mean = sum(share * part[k] for share, part in zip(shares, parts, strict=True))
        assert moment == pytest.approx(mean, abs=1e-7)


@pytest.mark.parametrize(
    ("infinite", "finite"),
    [
        # Beyond both levels; or on the flat stretch, shrunk to min(t + Z - b, t).
        (Pieces(1.2, 0.7, 0.5), Pieces(1.2, 0.7, 0.5)),
        (Pieces(1.2, 8.0, math.inf), Pieces(1.2, 16.0, 30.0)),
    ],
)
def test_infinite_sizes_are_limits(infinite, finite):
    # Phi(-12) and less is what the finite ones lack; t^2 = 900 costs a few digits.
    limit = infinite.risk_and_slope_of(Law((0.0, math.inf), (0.4, 0.6)), 0.3)
    near = finite.risk_and_slope_of(Law((0.0, 30.0), (0.4, 0.6)), 0.3)
    assert near == pytest.approx(limit, abs=1e-10)


@pytest.mark.parametrize(("pieces", "law"), LAWS)
def test_over_the_flat_stretch_the_weights_balance(pieces, law):
    """The share with the upper level, from its definition: |x| - h has the mean of the weights.

    All ranks beyond the stretch have the upper level, and within it the share s of the ranks
    with  s a + (1 - s) b = mean(|x| - h).
    """
    b, a, h = pieces.b, pieces.b + pieces.gap, pieces.h
    masses = dict(zip((None, *law.sizes), (0.8, *(0.2 * s for s in law.shares)), strict=True))

    def density(x):
        return sum(
            mass * (norm.pdf(x - (size or 0.0)) + norm.pdf(x + (size or 0.0)))
            for size, mass in masses.items()
        )

    def over(f, low, high):
        return quad(lambda x: f(x) * density(x), low, high, limit=200)[0]

    stretch = over(lambda x: 1.0, b + h, a + h)
    within = over(lambda x: (x - h - b) / pieces.gap, b + h, a + h)
    beyond = over(lambda x: 1.0, a + h, a + h + 12.0)
    assert 0.0 < within < stretch
    assert pieces.level_share(law, 0.2) == pytest.approx(within + beyond, abs=1e-7)


def test_equal_levels_need_no_share():
    law = Law((0.0, math.inf), (0.4, 0.6))
    assert Pieces(1.0, 0.0, 0.0).level_share(law, 0.2) == 1.0
