"""What needs no search, fast enough to be read on every move of the hand.

The searched boundaries fall back on the closed form and on the polar law wherever nothing
better is found. Both are explicit along a curve (see `lasso_curve`, and below), so that one
vectorised pass gives them at every TPP, with the places where the polar law ends.

The risk of the polar law is straight in the share x of the candidates that outgrow tau (see
`polar`), so at a zero threshold b the share with risk delta is

    x = (delta - R(b, 0)) / (R(b, 1) - R(b, 0)),   u = l + (1 - l) 2 Phi(-b),   l = x / eps.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from engine.limits.lasso_curve import lasso_curve
from engine.limits.polar import risk_at, saturated
from engine.limits.transition import critical, limit
from engine.limits.two_level_closed_form import beyond_limit
from engine.normal import Array, tail

__all__ = ["LARGEST_LOST", "Known", "known"]


@dataclass(frozen=True)
class Known:
    """The best of what needs no search, for one study.

    `polar` holds the curve (tpp, fdp) of the polar law, `polar_end` the TPP up to which it has
    a threshold, `admitted_end` the one up to which two-level may use it; both 1 where they
    last. `lasso` is the curve of the lasso up to `power_limit`. `level` and `share` belong to
    the saturated polar law, which is open to sorted L1 from the TPP `saturated_from` on.
    """

    sampling_ratio: float
    sparsity: float
    critical_sparsity: float
    power_limit: float
    lasso: tuple[Array, Array]
    polar: tuple[Array, Array]
    polar_end: float
    admitted_end: float
    level: float
    share: float
    saturated_from: float

    def end(self, penalty: str) -> float:
        """TPP up to which the polar law is open to a penalty."""
        return self.admitted_end if penalty == "two-level" else self.polar_end

    def fdp(self, penalty: str, u: Array) -> Array:
        """Lowest known FDP at TPPs in (0, 1]."""
        below = np.interp(u, *self.lasso)
        beyond = beyond_limit(u, np.asarray(self.sparsity), np.asarray(self.critical_sparsity))
        closed = np.where(u > self.power_limit, beyond, below)
        polar = np.where(u <= self.end(penalty), np.interp(u, *self.polar), 1.0)
        best = np.minimum(closed, polar)
        if penalty == "two-level" or self.saturated_from >= 1.0:
            return best
        eps, x = self.sparsity, self.share
        false = (1.0 - eps) * (eps * u - x) / (eps - x)
        past = np.where(u >= self.saturated_from, false / (false + eps * u), 1.0)
        return np.minimum(best, past)


def known(sampling_ratio: float, sparsity: float) -> Known:
    """Return what is known of a study without a search."""
    delta, eps = sampling_ratio, sparsity
    eps_star, level, share = _of_ratio(delta)
    u_star = float(limit(np.asarray(delta), np.asarray(eps), np.asarray(eps_star)))
    tpp, fdp = lasso_curve(delta, eps)
    polar, polar_end, admitted_end = _polar(delta, eps)
    return Known(
        sampling_ratio=delta,
        sparsity=eps,
        critical_sparsity=eps_star,
        power_limit=u_star,
        lasso=(tpp[::-1], fdp[::-1]),
        polar=polar,
        polar_end=polar_end,
        admitted_end=admitted_end,
        level=level,
        share=share,
        saturated_from=_saturated_from(delta, eps, level, share),
    )


@lru_cache(maxsize=1024)  # studies looked at together often share their sampling ratio
def _of_ratio(delta: float) -> tuple[float, float, float]:
    """Critical sparsity, and level and share of the saturated polar law."""
    level, share = saturated(np.asarray(delta))
    return float(critical(np.asarray(delta))), float(level), float(share)


def _polar(delta: float, eps: float) -> tuple[tuple[Array, Array], float, float]:
    """The curve of the polar law from TPP 0 on, its end, and the end of E eta' <= delta."""
    x = (delta - _RISK_0) / _RISE
    large = x / eps
    u = large + (1.0 - large) * _CHANCE
    stop = np.flatnonzero((large[:-1] >= 1.0) | (u[1:] <= u[:-1]))
    count = int(stop[0]) + 1 if len(stop) else len(u)
    u, x = u[:count], x[:count]
    end = min(float(u[-1]), 1.0)
    excess = x * _TOP[:count] + (1.0 - x) * _CHANCE[:count] - delta
    over = np.flatnonzero(excess > 0.0)
    admitted = end
    if len(over):
        k = max(int(over[0]), 1)
        part = excess[k - 1] / (excess[k - 1] - excess[k])
        admitted = min(float(u[k - 1] + part * (u[k] - u[k - 1])), end)
    false = (1.0 - eps) * _CHANCE[:count]
    curve = np.append(0.0, u), np.append(0.0, false / (false + eps * u))
    return curve, end, admitted


def _saturated_from(delta: float, eps: float, level: float, share: float) -> float:
    """TPP from which the saturated law is open: there its threshold is its level."""
    if delta >= LARGEST_LOST or share >= eps:
        return 1.0
    return (share + (eps - share) * 2.0 * float(tail(np.asarray(level)))) / eps


# From a threshold of 9 on the nulls on the list can be neglected. Below one of about 0.4 large
# effects have less risk than none and the equation for x turns over: the curve has ended there.
_B = np.linspace(9.0, 0.0, 2001)
_B = _B[risk_at(_B, np.ones_like(_B)) - risk_at(_B, np.zeros_like(_B)) > 1e-3]
_RISK_0 = risk_at(_B, np.zeros_like(_B))
_RISE = risk_at(_B, np.ones_like(_B)) - _RISK_0
_CHANCE = 2.0 * tail(_B)
_TOP = tail(-_B)

# The largest sampling ratio at which the polar law of some sparsity has no threshold at TPP 1:
# the largest stationary risk, where `saturated` stands for all larger ratios.
LARGEST_LOST = float(risk_at(*saturated(np.asarray(1.0))))
