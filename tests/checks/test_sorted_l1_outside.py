"""The sorted-L1 boundary against computed values, a generic solver, a naive search and fits."""

import math

import cvxpy
import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.stats import norm

from engine import power_limit, sorted_l1_boundary, two_level_closed_form
from engine.limits.least_risk import least_risk
from engine.limits.sorted_l1 import size_of

# Computed by two independent programs, not by this project; each is printed to the digits that
# it is trusted to.
COMPUTED = [
    ((0.2, 0.3, 0.2), 0.157701, 2e-5),
    ((0.4, 0.3, 0.2), 0.451578, 2e-5),
    ((0.5, 0.3, 0.2), 0.544894, 2e-5),
    ((0.56, 0.3, 0.2), 0.5918, 7e-5),  # four digits printed
    ((0.6, 0.3, 0.2), 0.610985, 2e-5),
    ((0.8, 0.3, 0.2), 0.711140, 2e-5),
    ((0.9, 0.3, 0.2), 0.760270, 2e-5),
    ((0.4, 0.6, 0.3), 0.1858804, 2e-5),
    ((0.9, 1.1, 0.5), 0.2022522, 2e-5),
    ((1.0, 1.2, 0.9), 0.05285, 2e-5),
]


@pytest.mark.parametrize(("point", "fdp", "tolerance"), COMPUTED)
def test_computed_values(point, fdp, tolerance):
    assert sorted_l1_boundary(*point) == pytest.approx(fdp, abs=tolerance)


# --- Least risk: a generic quadratic program ---------------------------------------------


@pytest.mark.parametrize(
    ("threshold", "sizes", "masses"),
    [
        (0.687, (1.4745,), (0.2,)),
        (1.2, (0.9, 3.0), (0.1, 0.05)),
        (0.3, (0.4,), (0.7,)),
        (1.9, (4.0,), (0.01,)),
    ],
)
def test_least_risk_against_a_quadratic_program(threshold, sizes, masses):
    """Minimise over increments of eta between 0 and those of x, which PAVA does not know of."""
    best = least_risk(threshold, sizes, masses)
    x = best.x
    w = 2.0 * (1.0 - sum(masses)) * norm.pdf(x)
    top = np.zeros_like(x)
    for t, p in zip(sizes, masses, strict=True):
        w += p * (norm.pdf(x - t) + norm.pdf(x + t))
        top += p * t * (norm.pdf(x - t) - norm.pdf(x + t))
    mean = top / np.maximum(w, 1e-250)
    eta = cvxpy.Variable(x.size)
    distance = cvxpy.sum_squares(cvxpy.multiply(np.sqrt(best.mass), eta - mean))
    rules = [eta[0] == 0.0, cvxpy.diff(eta) >= 0.0, cvxpy.diff(eta) <= np.diff(x)]
    program = cvxpy.Problem(cvxpy.Minimize(distance), rules)
    program.solve(solver=cvxpy.CLARABEL)
    energy = sum(p * t * t for t, p in zip(sizes, masses, strict=True))
    risk = energy + program.value - float(best.mass @ mean**2)
    # The same nodes: what remains is the solver's own tolerance, 1e-8 of the terms of order 1.
    assert best.risk == pytest.approx(risk, abs=1e-6)
    assert best.risk <= risk + 1e-7


# --- Boundary: a naive search over all laws of two sizes -----------------------------------


def pooled(aims, weights):
    """Pool adjacent violators as textbooks have it: merge while a block exceeds the next."""
    blocks = []
    for aim, weight in zip(aims, weights, strict=True):
        blocks.append([aim, weight, 1])
        while len(blocks) > 1 and blocks[-2][0] >= blocks[-1][0]:
            a, v, m = blocks.pop()
            b, w, n = blocks.pop()
            blocks.append([(a * v + b * w) / (v + w), v + w, m + n])
    return np.concatenate([np.full(count, level) for level, _, count in blocks])


def naive_risk(alpha, law, eps, step):
    """Least risk for ((size, share of the actives), ...), by midpoints and textbook PAVA."""
    finite = [(t, eps * share) for t, share in law if t < math.inf]
    infinite = eps * sum(share for t, share in law if t == math.inf)
    end = max(alpha, *(t for t, _ in finite)) + 7.0
    x = np.arange(alpha + 0.5 * step, end, step)
    w = 2.0 * (1.0 - eps) * norm.pdf(x) + 1e-200
    top = np.zeros_like(x)
    for t, p in finite:
        w += p * (norm.pdf(x - t) + norm.pdf(x + t))
        top += p * t * (norm.pdf(x - t) - norm.pdf(x + t))
    aims, weights = x - top / w, w * step
    if infinite:
        aims, weights = np.append(aims, 0.0), np.append(weights, infinite)
    withheld = np.maximum(pooled(aims, weights), alpha)
    own = np.append(top / w, 0.0)[: aims.size]
    energy = sum(p * t * t for t, p in finite) + infinite
    return energy + float(weights @ ((withheld - aims) ** 2 - own**2))


def chance(t, alpha):
    return norm.sf(alpha - t) + norm.sf(alpha + t)


def law_of(low, high, alpha, u):
    share = (u - chance(low, alpha)) / (chance(high, alpha) - chance(low, alpha))
    return (low, 1.0 - share), (high, share)


def least_naive_risk(alpha, u, eps):
    """Dense grid of pairs of sizes around the common one, then a local search from the best."""
    common = size_of(alpha, u)
    lows = common * np.linspace(0.0, 0.98, 7)
    highs = [*(common + np.array([0.05, 0.3, 0.8, 1.5, 2.5, 4.0, 6.0, 10.0])), math.inf]
    coarse = [
        (naive_risk(alpha, law_of(low, high, alpha, u), eps, 0.05), low, high)
        for low in lows
        for high in highs
    ]
    risks = [naive_risk(alpha, ((common, 1.0),), eps, 0.01)]
    for _, low, high in sorted(coarse)[:2]:
        if high == math.inf:
            risks.append(naive_risk(alpha, law_of(low, high, alpha, u), eps, 0.01))
            continue

        def risk(pair):
            pair = abs(pair[0]), pair[1]
            if not chance(pair[0], alpha) < u < chance(pair[1], alpha):
                return 9.0
            return naive_risk(alpha, law_of(*pair, alpha, u), eps, 0.02)

        local = minimize(risk, (low, high), method="Nelder-Mead", options={"maxiter": 25})
        pair = abs(local.x[0]), local.x[1]
        risks.append(naive_risk(alpha, law_of(*pair, alpha, u), eps, 0.01))
    return min(risks)


@pytest.mark.parametrize(
    ("u", "delta", "eps"),
    [
        (0.30, 0.3, 0.2),  # some effects outgrow the noise
        (0.55, 0.3, 0.2),  # where the best law changes
        (0.80, 0.3, 0.2),  # one size
        (0.4375, 0.1, 0.05),  # some outgrow the noise, estimates just past the threshold vanish
        (0.085, 0.034, 0.19),  # some of one size, the others tend to 0
        (0.20, 0.016, 0.0122),  # the same in a sparse study
        (0.995, 0.7, 0.6),  # dense, close to TPP 1
        (0.60, 1.2, 0.7),
    ],
)
def test_no_law_of_two_sizes_goes_lower(u, delta, eps):
    fdp = sorted_l1_boundary(u, delta, eps)

    def threshold(q):
        return -norm.ppf(0.5 * q * eps * u / ((1.0 - q) * (1.0 - eps)))

    # Midpoints at steps of 0.01 are right to about 1e-5 of the risk.
    noise = 2e-5 * delta
    reached = least_naive_risk(threshold(fdp), u, eps)
    assert reached == pytest.approx(delta, abs=noise)
    # An FDP lower by half a percent asks for more risk than there is, beyond that noise.
    below = least_naive_risk(threshold(0.995 * fdp), u, eps)
    assert below > delta + noise


# --- A finite study: sorted L1 goes below the closed-form curve ---------------------------


def fit(x, y, weights, steps):
    """Accelerated proximal gradient with restarts; x has columns of about unit length."""
    size = np.linalg.norm(x, 2) ** 2
    b = momentum = np.zeros(x.shape[1])
    speed = 1.0
    for _ in range(steps):
        ascent = momentum - x.T @ (x @ momentum - y) / size
        order = np.argsort(-np.abs(ascent))
        gaps = np.abs(ascent)[order] - weights / size
        following = np.zeros_like(b)
        following[order] = np.maximum(-pooled(-gaps, np.ones_like(gaps)), 0.0)
        following *= np.sign(ascent)
        if (momentum - following) @ (following - b) > 0.0:
            speed = 1.0
        faster = 0.5 * (1.0 + math.sqrt(1.0 + 4.0 * speed**2))
        momentum = following + (speed - 1.0) / faster * (following - b)
        b, speed = following, faster
    return b


def drawn(rng, n, p, k, threshold, size):
    """TPP and FDP of one fit with the best sorted-L1 weights for one size of effect.

    All in units of tau: the noise is what the risk leaves of the sampling ratio.
    """
    delta, eps = n / p, k / p
    best = least_risk(threshold, (size,), (eps,))
    ranks = (np.arange(p) + 0.5) / p
    beyond = (1.0 - eps) * chance(0.0, best.x) + eps * chance(size, best.x)
    profile = np.interp(ranks, beyond[::-1], best.withheld[::-1])
    weights = (1.0 - best.slope / delta) * profile
    x = rng.standard_normal((n, p)) / math.sqrt(n)
    truth = np.zeros(p)
    truth[:k] = size * rng.choice([-1.0, 1.0], k)
    noise = math.sqrt(1.0 - best.risk / delta)
    selected = fit(x, x @ truth + noise * rng.standard_normal(n), weights, 1500) != 0.0
    return selected[:k].mean(), selected[k:].sum() / selected.sum()


def test_fits_go_below_the_closed_form_curve():
    """Simulated: 6 studies at sampling ratio 0.3 and sparsity 0.2, above the power limit.

    The zero threshold is lowered by 0.02, since at the boundary itself the noise is 0 and the
    weights are next to 0.
    """
    rng = np.random.default_rng(3)
    fdp = sorted_l1_boundary(0.8, 0.3, 0.2)
    threshold = -norm.ppf(0.5 * fdp * 0.2 * 0.8 / ((1.0 - fdp) * 0.8)) - 0.02
    size = size_of(threshold + 0.02, 0.8)
    tpps, fdps = np.transpose([drawn(rng, 180, 600, 120, threshold, size) for _ in range(6)])
    assert power_limit(0.3, 0.2) < 0.6
    # Four standard errors of the mean over the studies, as they spread, and 0.015 for the
    # bias of so small a study.
    error = 4.0 / math.sqrt(6.0)
    assert tpps.mean() == pytest.approx(0.805, abs=error * tpps.std(ddof=1) + 0.015)
    assert fdps.mean() == pytest.approx(0.716, abs=error * fdps.std(ddof=1) + 0.015)
    closed = two_level_closed_form(tpps, 0.3, 0.2)
    below = closed - fdps
    assert below.mean() > error * below.std(ddof=1)
