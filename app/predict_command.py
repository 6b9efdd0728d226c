"""`sparsereach predict`: what a penalty and a selection rule give for a study file."""

import argparse
import math
from typing import Any

from engine.penalties.registry import PENALTIES
from engine.penalties.weights import load_weights
from engine.predicted import Prediction
from engine.prediction import SELECTIONS, predict
from engine.quantities import FDP, LAMBDA, LEVEL, RAMP_LEVEL, RANK_SHARE, TPP, Quantity
from engine.study import Study

__all__ = ["WEIGHTS_BYTES", "add_predict", "answer_of", "forecast", "table_of"]

WEIGHTS_BYTES = 30_000_000

_GOALS = {"fdp": FDP, "tpp": TPP, "lambda": LAMBDA}


def add_predict(parser: argparse.ArgumentParser) -> None:
    """Declare the words and options of the command."""
    parser.add_argument("file", metavar="FILE", help="study file (JSON)")
    parser.add_argument("--penalty", metavar="P", help=f"one of {', '.join(PENALTIES)}")
    parser.add_argument(
        "--selection",
        metavar="S",
        default="nonzero",
        help=f"one of {', '.join(SELECTIONS)}; default nonzero",
    )
    for quantity in (*_GOALS.values(), RAMP_LEVEL, RANK_SHARE):
        parser.add_argument(quantity.option, metavar="X", help=_help(quantity))
    parser.add_argument("--levels", nargs=2, metavar=("A", "B"), help=_help(LEVEL))
    parser.add_argument("--weights", metavar="FILE", help="nonincreasing weights, JSON or CSV")
    parser.add_argument("--json", action="store_true", help="print one JSON object")


def _help(quantity: Quantity) -> str:
    return f"{quantity.meaning}: {quantity.rule}"


def forecast(study: Study, options: argparse.Namespace, weights: bytes | None) -> Prediction:
    """Return the prediction that the options ask for.

    Without a goal the study's target counts: its FDP.

    Raises
    ------
    ValueError
        Names the option, the rule and the value.
    """
    if options.penalty is None:
        raise ValueError(f"--penalty must be given: one of {', '.join(PENALTIES)}")
    given = {name: getattr(options, name) for name in _GOALS}
    goals = {
        name: _number(_GOALS[name], text) for name, text in given.items() if text is not None
    }
    enough = {"fdp", "tpp", "lambda"} if options.selection == "nonzero" else {"fdp", "tpp"}
    if study.target is not None and not enough & set(goals):
        goals["fdp"] = study.target.fdp
    stated: dict[str, Any] = {}
    if options.levels is not None:
        stated["levels"] = tuple(_number(LEVEL, text, "--levels") for text in options.levels)
    for quantity in (RANK_SHARE, RAMP_LEVEL):
        text = getattr(options, quantity.name)
        if text is not None:
            stated[quantity.name] = _number(quantity, text)
    if weights is not None:
        stated["weights"] = load_weights(weights)
    lam = goals.pop("lambda", None)
    return predict(study, options.penalty, options.selection, lam=lam, **goals, **stated)


def _number(quantity: Quantity, text: str, where: str = "") -> float:
    value: Any = text
    if "_" not in text:  # Python's 0_3 is not a number here
        try:
            value = float(text)
        except ValueError:
            value = text
    return quantity.check(value, where or quantity.option)


def answer_of(found: Prediction) -> dict[str, Any]:
    """Return the prediction as the command prints it."""
    return {
        "tpp": _or_none(found.tpp),
        "fdp": _or_none(found.fdp),
        "zero_threshold": _or_none(found.zero_threshold),
        "cut": _or_none(found.cut),
        "lambda": _or_none(found.lam),
        "lambda_per_run": _or_none(found.lam_per_run),
        "tau": _or_none(found.tau),
        "mse": _or_none(found.mse),
        "list_size": _or_none(found.list_size),
        "by_effect": [
            {"spread": each.spread, "scale": each.scale, "tpp": _or_none(each.tpp)}
            if each.spread
            else {"size": each.size, "tpp": _or_none(each.tpp)}
            for each in found.by_effect
        ],
        "spread": {"tpp": _or_none(found.tpp_sd), "fdp": _or_none(found.fdp_sd)},
        "reason": found.reason or None,
    }


def table_of(found: Prediction) -> str:
    """Return the prediction as a table for people."""
    if found.reason:
        return f"none: {found.reason}"
    rows: list[tuple[str, float]] = [
        ("TPP", found.tpp),
        ("FDP", found.fdp),
        ("list size", found.list_size),
        ("zero threshold, in tau", found.zero_threshold),
        ("cut, in tau", found.cut),
        ("lambda, columns of length one", found.lam),
        ("lambda, columns of variance one", found.lam_unit_variance),
        ("lambda, variance one, loss over 2n", found.lam_per_run),
        ("tau", found.tau),
        ("mean squared error", found.mse),
        ("SD of TPP in one study, at least", found.tpp_sd),
        ("SD of FDP in one study, at least", found.fdp_sd),
    ]
    rows += [
        (
            f"TPP of {each.spread or 'effect'} {each.scale if each.spread else each.size:g}",
            each.tpp,
        )
        for each in found.by_effect
    ]
    shown = [f"{name:36}{value:.6g}" for name, value in rows if not math.isnan(value)]
    if found.levels is not None and found.share is not None:
        upper, lower = found.levels
        shown.append(f"levels, in tau                      {upper:.6g} and {lower:.6g}")
        shown.append(f"share of ranks at the larger        {found.share:.6g}")
    if found.ramp_level is not None:
        shown.append(f"ramp level                          {found.ramp_level:.6g}")
    return "\n".join([*shown, *([f"caution: {found.caution}"] if found.caution else [])])


def _or_none(value: float) -> float | None:
    return None if math.isnan(value) else value
