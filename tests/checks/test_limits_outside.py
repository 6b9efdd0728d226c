"""Transition, power limit, lasso, two-level: values from outside the project.

"Computed": by two independent programs (40-digit arithmetic, or fine grids), not by this
project. "Published, from memory": printed in a paper, written down from memory.
"""

import numpy as np
import pytest
from scipy.optimize import brentq
from scipy.stats import norm

from engine import (
    critical_sparsity,
    lasso_boundary,
    power_limit,
    two_level_boundary,
    two_level_closed_form,
)
from engine.limits.transition import threshold_at_sparsity
from engine.normal import null_risk

CLOSED = 1e-9  # the accuracy the closed forms promise; the values below carry 11 or 12 digits


# Computed, two routes agreeing to 14 digits.
@pytest.mark.parametrize(
    ("ratio", "value"),
    [
        (0.1, 0.018942936776), (0.2, 0.048660192877), (0.3, 0.087235310474),
        (0.4, 0.134930394590), (0.5, 0.192844833091), (0.6, 0.263034326082),
        (0.7, 0.349189926734), (0.8, 0.458650653911), (0.9, 0.610352440321),
    ],
)  # fmt: skip
def test_transition_computed(ratio, value):
    assert critical_sparsity(ratio) == pytest.approx(value, abs=CLOSED)


# Published, from memory: *High-dimensional centrally symmetric polytopes with neighborliness
# proportional to dimension*, Discrete Comput. Geom. 35, 2006, weak threshold. The printed
# values sit .0012 to .0017 below the exact ones (old numerics): hence 2e-3.
@pytest.mark.parametrize(
    ("ratio", "share"), [(0.1, 0.188), (0.25, 0.266), (0.5, 0.384), (0.75, 0.532), (0.9, 0.677)]
)
def test_transition_published(ratio, share):
    assert critical_sparsity(ratio) / ratio == pytest.approx(share, abs=2e-3)


# Computed: the minimax soft-threshold risk M(eps); the transition is where M(eps*) = ratio.
@pytest.mark.parametrize(
    ("eps", "risk"),
    [
        (0.01, 0.061243959436), (0.05, 0.203899856330), (0.1, 0.328793505454),
        (0.2, 0.511129610373), (0.5, 0.831299905706),
    ],
)  # fmt: skip
def test_minimax_risk_computed(eps, risk):
    t = threshold_at_sparsity(np.array(eps))
    least = (1.0 - eps) * null_risk(t) + eps * (1.0 + t * t)
    assert least == pytest.approx(risk, abs=CLOSED)
    assert critical_sparsity(risk) == pytest.approx(eps, abs=CLOSED)


# Published, from memory, four digits (*False discoveries occur early on the lasso path*,
# Annals of Statistics 45(5), 2017): half a unit of the last one.
@pytest.mark.parametrize(("study", "value"), [((0.3, 0.2), 0.5676), ((0.3, 0.15), 0.6791)])
def test_power_limit_published(study, value):
    assert power_limit(*study) == pytest.approx(value, abs=5e-5)


# Computed.
@pytest.mark.parametrize(
    ("study", "value"),
    [
        ((0.3, 0.2), 0.567603328799), ((0.3, 0.15), 0.679104715799),
        ((0.5, 0.5), 0.619459579147), ((0.1, 0.1), 0.256400472141),
        ((0.5, 0.2), 0.977838316588), ((0.7, 0.4), 0.941445966320),
    ],
)  # fmt: skip
def test_power_limit_computed(study, value):
    assert power_limit(*study) == pytest.approx(value, abs=CLOSED)


# Computed, 30 digits: (sampling ratio, sparsity, TPP) and FDP.
@pytest.mark.parametrize(
    ("ratio", "eps", "u", "fdp"),
    [
        (1, 0.2, 0.2, 1.92658211993e-5), (1, 0.2, 0.5, 0.0208808596079),
        (1, 0.2, 1, 0.157711064286), (0.5, 0.1, 0.5, 0.0458821024784),
        (0.5, 0.1, 0.9, 0.253632855113), (0.5, 0.3, 0.4, 0.265405114390),
        (0.3, 0.2, 0.3, 0.331723971601), (0.3, 0.15, 0.6, 0.568608687850),
        (1.5, 0.2, 0.95, 0.0351795631726), (2, 0.5, 1, 0.0779758625321),
    ],
)  # fmt: skip
def test_lasso_computed(ratio, eps, u, fdp):
    assert lasso_boundary(u, ratio, eps) == pytest.approx(fdp, abs=CLOSED)


# Computed.
@pytest.mark.parametrize(
    ("ratio", "eps", "u", "fdp"),
    [
        (0.3, 0.2, 0.6, 0.659522743278), (0.3, 0.2, 0.7, 0.727803776733),
        (0.3, 0.2, 0.8, 0.763391740720), (0.3, 0.2, 0.9, 0.785231468716),
        (0.5, 0.5, 0.7, 0.422274207682), (0.5, 0.5, 0.9, 0.481929656464),
        (0.1, 0.1, 0.3, 0.803626069085), (0.1, 0.1, 0.9, 0.897607090191),
    ],
)  # fmt: skip
def test_two_level_closed_form_computed(ratio, eps, u, fdp):
    assert two_level_closed_form(u, ratio, eps) == pytest.approx(fdp, abs=CLOSED)


# Computed by a fine search; trusted to 2e-4.
@pytest.mark.parametrize(
    ("u", "fdp"),
    [(0.4, 0.45157), (0.5, 0.54490), (0.56, 0.59464), (0.6, 0.61494), (0.8, 0.71949)],
)
def test_exact_two_level_computed(u, fdp):
    assert two_level_boundary(u, 0.3, 0.2) == pytest.approx(fdp, abs=2e-4)


# Computed to five digits at (.15, .05), TPP .70, where E eta' <= ratio binds: between these.
def test_exact_two_level_where_the_slope_binds():
    assert 0.7835 <= two_level_boundary(0.70, 0.15, 0.05) <= 0.7850


def published_equation(t: float, u: float, delta: float, eps: float) -> float:
    """The two sides of the published equation, with scipy.stats.norm; 0 at its roots."""
    null = (1 + t * t) * norm.sf(t) - t * norm.pdf(t)
    left = (2 * (1 - eps) * null + eps * (1 + t * t) - delta) / (
        eps * ((1 + t * t) * (1 - 2 * norm.sf(t)) + 2 * t * norm.pdf(t))
    )
    return left - (1 - u) / (1 - 2 * norm.sf(t))


@pytest.mark.parametrize(
    ("ratio", "eps"), [(0.05, 0.02), (0.3, 0.2), (0.8, 0.1), (1.0, 0.6), (3, 0.9)]
)
@pytest.mark.parametrize("part", [0.02, 0.3, 0.7, 0.97])
def test_lasso_against_plain_root_finding(ratio, eps, part):
    """scipy.optimize.brentq on the equation as published, at its largest root."""
    u = part * power_limit(ratio, eps)
    t = np.linspace(0.02, 3.0 + np.sqrt(2.0 * ratio / (eps * u)), 4000)
    values = published_equation(t, u, ratio, eps)
    last = np.flatnonzero(np.diff(np.sign(values)))[-1]
    root = brentq(published_equation, t[last], t[last + 1], (u, ratio, eps), xtol=1e-13)
    false = 2 * (1 - eps) * norm.sf(root)
    assert lasso_boundary(u, ratio, eps) == pytest.approx(false / (false + eps * u), abs=CLOSED)
