"""A penalty's path from the smallest admissible zero threshold up, and searches along it."""

import math
from collections.abc import Callable
from itertools import pairwise

import numpy as np
from scipy.optimize import brentq

from engine.evolution import State, settle, settle_all, tpp_of
from engine.normal import Array
from engine.penalties.designed import Designed
from engine.penalties.penalty import Penalty
from engine.roots import least_on
from engine.signal import SignalLaw

__all__ = ["crossings", "quietest", "stretches", "top_threshold"]

_LOOKS = 40  # thresholds looked at before any refinement
_HALVINGS = 14  # an end of a stretch is found to a hundred-thousandth of tau
_ACCURACY = 1e-10
_FLAT = 1e-4  # tau is flat at its smallest: its error is the square of this

Stretch = list[State]


def top_threshold(law: SignalLaw, tpp: float) -> float:
    """Return a zero threshold at which about this TPP is left."""
    tau = math.sqrt(law.noise**2 + law.energy / law.delta)
    high = float(law.sizes.max()) / tau + 40.0
    return float(brentq(lambda b: tpp_of(law, tau, b) - tpp, 0.0, high, xtol=1e-6))


def stretches(law: SignalLaw, penalty: Penalty, thresholds: Array) -> list[Stretch]:
    """Return the admissible stretches of the path, from low thresholds to high.

    Between two stretches the path jumps.
    """
    states = settle_all(law, penalty, thresholds)
    found: list[Stretch] = []
    before: State | None = None
    for i, state in enumerate(states):
        if state is not None:
            if before is None:
                found.append([])
                if i > 0:
                    found[-1].append(_end(law, penalty, state, float(thresholds[i - 1])))
            found[-1].append(state)
        elif before is not None:
            found[-1].append(_end(law, penalty, before, float(thresholds[i])))
        before = state
    return found


def _end(law: SignalLaw, penalty: Penalty, state: State, outside: float) -> State:
    """The last admissible state between one that is and a threshold that is not."""
    for _ in range(_HALVINGS):
        middle = 0.5 * (state.threshold + outside)
        other = settle(law, penalty, middle, state)
        if other is None:
            outside = middle
        else:
            state = other
    return state


def crossings(
    law: SignalLaw, path: list[Stretch], penalty: Penalty, surplus: Callable[[State], float]
) -> list[State]:
    """Return the states of a path at which `surplus` is 0."""
    return [
        state
        for stretch in path
        for left, right in pairwise(stretch)
        if surplus(left) * surplus(right) <= 0.0
        and (state := _crossing(law, penalty, left, right, surplus)) is not None
    ]


class _GapError(Exception):
    """The path jumps between two states that were taken for neighbours."""


def _crossing(
    law: SignalLaw,
    penalty: Penalty,
    left: State,
    right: State,
    surplus: Callable[[State], float],
) -> State | None:
    nearest = left

    def at(threshold: float) -> float:
        nonlocal nearest
        state = settle(law, penalty, threshold, nearest)
        if state is None:
            raise _GapError
        nearest = state
        return surplus(state)

    for end in (left, right):
        if surplus(end) == 0.0:
            return end
    try:
        root = brentq(at, left.threshold, right.threshold, xtol=_ACCURACY, rtol=_ACCURACY)
        at(float(root))
    except (_GapError, ValueError):  # ValueError: a fresh evaluation at an end lost the sign
        return None
    return nearest


def quietest(law: SignalLaw, penalty: Penalty) -> State | None:
    """Return the state of smallest tau; None where no strength has a fit."""
    if isinstance(penalty, Designed):  # each threshold more is one restriction more
        return settle(law, penalty, 0.0)
    path = stretches(law, penalty, np.linspace(0.0, top_threshold(law, 0.01), _LOOKS))
    states = [state for stretch in path for state in stretch]
    if not states:
        return None
    best = min(states, key=lambda state: state.tau)
    stretch = next(stretch for stretch in path if best in stretch)
    i = stretch.index(best)
    low, high = stretch[max(i - 1, 0)], stretch[min(i + 1, len(stretch) - 1)]

    def tau(threshold: float) -> float:
        state = settle(law, penalty, threshold, best)
        return math.inf if state is None else state.tau

    threshold, least = least_on(tau, low.threshold, high.threshold, _FLAT)
    return settle(law, penalty, threshold, best) if least < best.tau else best
