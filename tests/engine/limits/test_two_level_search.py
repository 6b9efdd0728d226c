"""The two-level search against a slow one: linear programs over laws, polished shrinkages."""

import numpy as np
import pytest
from scipy.optimize import linprog, minimize
from scipy.stats import norm

from engine import sorted_l1_boundary, two_level_boundary
from engine.limits.two_level import two_level_optima
from engine.limits.two_level_moments import risk_and_slope, selected

# Sizes admitted to a law: 0.04 apart. It costs the programs some 1e-4 in FDP, and up to 4e-4
# where their values are nearly flat in the threshold.
SIZES = np.concatenate([np.linspace(0.0, 6.0, 151), np.linspace(6.2, 12.0, 30)])

# Studies in which one valley of the search, or its crossing from one law to another, is hard to
# find: narrow gaps, infinite ones, E eta' at the sampling ratio, effects that tend to 0.
SEARCHED = (
    (0.56, 0.3, 0.2), (0.8, 0.3, 0.2), (0.8109, 0.0135, 0.0021), (0.8428, 0.3698, 0.1624),
    (0.9439, 0.5826, 0.3634), (0.9904, 0.0771, 0.0140), (0.9955, 0.1971, 0.0485),
    (0.7717, 0.0476, 0.0104), (0.9850, 0.5283, 0.2375), (0.9901, 0.6070, 0.3193),
    (0.8713, 0.3304, 0.1258), (0.9549, 0.5932, 0.3691),
)  # fmt: skip
CLOSED_FORM = ((0.70, 0.15, 0.05), (0.7127, 0.0486, 0.0107), (0.6803, 0.0963, 0.0277))


def least_for(b, gap, height, u, delta, eps):
    """The least of max(risk, E eta') / ratio over all laws on the sizes above and infinity."""
    risk, slope = risk_and_slope(SIZES, np.array(b), np.array(gap), np.array(height))
    # Sizes beyond every level: found for sure, shrunk by the upper level.
    risk, slope = np.append(risk, 1.0 + (b + gap) ** 2), np.append(slope, 1.0)
    found = np.append(selected(SIZES, np.array(b)), 1.0)
    n = len(found)
    result = linprog(
        np.append(np.zeros(n), 1.0),
        A_ub=np.stack([np.append(eps * m / delta, -1.0) for m in (risk, slope)]),
        b_ub=[-(1.0 - eps) * m[0] / delta for m in (risk, slope)],
        A_eq=np.stack([np.append(np.ones(n), 0.0), np.append(found, 0.0)]),
        b_eq=[1.0, u],
        bounds=[(0.0, None)] * n + [(None, None)],
    )
    return result.fun if result.status == 0 else np.inf


def least_at(fdp, u, delta, eps):
    """The least of the above over shrinkages: polished from a grid, and from the optimum."""
    b = float(-norm.ppf(0.5 * fdp * eps * u / ((1.0 - fdp) * (1.0 - eps))))

    def value(place):
        gap, height = np.exp(np.minimum(place, np.log(9.0)))
        return least_for(b, gap, height, u, delta, eps)

    grid = np.log(
        [(g, h) for g in np.geomspace(0.1, 9.0, 8) for h in np.geomspace(0.005, 7.0, 10)]
    )
    starts = [*grid[np.argsort([value(place) for place in grid])[:2]]]
    found = two_level_optima(*(np.array([v]) for v in (u, delta, eps)))
    if found.kind[0] == "searched":
        starts.append(np.log([found.gap[0], found.height[0]]))
    return min(polished(value, start) for start in starts)


def polished(value, start):
    triangle = start + np.array([[0.0, 0.0], [0.1, 0.0], [0.0, 0.1]])
    options = {"maxfev": 70, "initial_simplex": triangle}
    return minimize(value, start, method="Nelder-Mead", options=options).fun


@pytest.mark.parametrize(("u", "delta", "eps"), SEARCHED + CLOSED_FORM)
def test_a_slow_search_finds_nothing_lower(u, delta, eps):
    """3e-4 below the boundary no law of any number of sizes makes any shrinkage feasible."""
    fdp, best = two_level_boundary(u, delta, eps), sorted_l1_boundary(u, delta, eps)
    assert least_at(max(fdp - 3e-4, 0.5 * (fdp + best)), u, delta, eps) > 1.0


@pytest.mark.parametrize(("u", "delta", "eps"), SEARCHED)
def test_the_programs_reach_it_too(u, delta, eps):
    """5e-4 above the boundary some law on their grid makes some shrinkage feasible."""
    assert least_at(two_level_boundary(u, delta, eps) + 5e-4, u, delta, eps) < 1.0


@pytest.mark.parametrize(
    ("delta", "eps"),
    [
        (0.0135, 0.0021), (0.0476, 0.0104), (0.0771, 0.0140), (0.1971, 0.0485),
        (0.3698, 0.1624), (0.5826, 0.3634), (0.6943, 0.5300), (0.5283, 0.2375),
    ],
)  # fmt: skip
def test_curves_have_no_spikes(delta, eps):
    # A valley missed at single points shows as a spike. Two neighbours stray by 2e-5 each.
    fdp = two_level_boundary(np.linspace(0.3, 0.999, 140), delta, eps)
    assert np.diff(fdp).min() > -5e-5
