"""What the Signal page shows: what each penalty and selection rule gives for this signal."""

from dataclasses import dataclass, replace
from functools import lru_cache

from engine.normal import Array
from engine.prediction import (
    Curve,
    Prediction,
    curve,
    marginal_screening,
    predict,
    prediction_optimal_lasso,
)
from engine.study import Study

__all__ = ["COMPARED", "RULES", "Comparators", "Outlook", "comparators", "outlook"]

# The families that are compared, and the selection rules with their words.
COMPARED = ("lasso", "two-level", "ramp", "designed")
RULES = {
    "nonzero": "nonzero in the fit",
    "two-stage": "fit, debias, cut",
    "two-stage-bh": "cut without a belief",
}


@dataclass(frozen=True)
class Outlook:
    """One family: its curves along the strength, and along the cut of its fit of least error,
    and its points at the wanted FDP by selection rule.
    """

    study: Study
    fdp: float
    family: str
    curves: dict[str, tuple[Array, Array]]
    points: dict[str, Prediction]


@dataclass(frozen=True)
class Comparators:
    """What a planner knows already: screening one by one, and the lasso of least error."""

    study: Study
    fdp: float
    screening: Prediction
    least_error: Prediction


def outlook(family: str, asked: tuple[Study, float]) -> tuple[Outlook]:
    """Evaluate one family for a study and an FDP; this is what workers run."""
    study, fdp = asked
    points = {
        rule: replace(predict(study, family, rule, fdp=fdp), _weights=None) for rule in RULES
    }
    curves = {rule: _curve(study, family, rule) for rule in ("nonzero", "two-stage")}
    return (Outlook(study, fdp, family, curves, points),)


def comparators(asked: tuple[Study, float]) -> tuple[Comparators]:
    """Evaluate the comparators for a study and an FDP; this is what workers run."""
    study, fdp = asked
    screening = replace(marginal_screening(study, fdp=fdp), _weights=None)
    least_error = replace(prediction_optimal_lasso(study), _weights=None)
    return (Comparators(study, fdp, screening, least_error),)


@lru_cache(maxsize=64)
def _curve(study: Study, family: str, rule: str) -> tuple[Array, Array]:
    path: Curve = curve(study, family, rule)
    return path.tpp, path.fdp
