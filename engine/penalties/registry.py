"""The penalty families: one line each."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from engine.penalties.designed import Designed
from engine.penalties.lasso import Lasso
from engine.penalties.penalty import Penalty
from engine.penalties.ramp import Ramp, TunedRamp
from engine.penalties.two_level import TunedTwoLevel, TwoLevel
from engine.penalties.weights import Weights

__all__ = ["PENALTIES", "PenaltyFamily"]


@dataclass(frozen=True)
class PenaltyFamily:
    """A family: its key in options and files, its name on the screen, its parameters.

    `make` takes the sampling ratio and the checked parameters, all of `parameters` or none;
    `tunable` families choose what is not stated.
    """

    key: str
    label: str
    parameters: tuple[str, ...]
    tunable: bool
    make: Callable[..., Penalty]


def _two_level(delta: float, levels: Any = None, share: Any = None) -> Penalty:
    if levels is None:
        return TunedTwoLevel(delta)
    upper, lower = levels
    return TwoLevel(upper, lower, share)


def _ramp(delta: float, ramp_level: Any = None) -> Penalty:
    return TunedRamp() if ramp_level is None else Ramp(ramp_level)


PENALTIES = {
    family.key: family
    for family in (
        PenaltyFamily("lasso", "lasso", (), True, lambda delta: Lasso()),
        PenaltyFamily("two-level", "two-level", ("levels", "share"), True, _two_level),
        PenaltyFamily("ramp", "ramp", ("ramp_level",), True, _ramp),
        PenaltyFamily("designed", "designed", (), True, lambda delta: Designed()),
        PenaltyFamily("weights", "own weights", ("weights",), False,
                      lambda delta, weights: Weights(weights)),
    )
}  # fmt: skip
