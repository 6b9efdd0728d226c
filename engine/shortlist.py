"""Operating points that a user keeps, and their file.

The file is JSON with the schema name 'sparsereach/shortlist/1'. A point carries all that an
analysis needs to use it and all that a reader needs to judge it: the whole study, the penalty,
the selection rule, the strength, what is predicted, the limits at its TPP, the weights.

Points kept on Reach are limits: they hold for the law of effects stated in them, in units of
tau, the effective noise of the fit. They have no scale of their own, so lambda is null and the
reason stands beside it.
"""

import math
from dataclasses import dataclass, replace
from typing import Any

from engine.files import SHORTLIST_BYTES, check_keys, check_list, check_text, dump, parse
from engine.limits.families import FAMILIES, witness
from engine.limits.transition import critical_sparsity, power_limit
from engine.limits.witness import Witness
from engine.quantities import (
    CALIBRATION,
    CRITICAL_SPARSITY,
    FDP,
    POWER_LIMIT,
    RISK,
    SHARE,
    SIZE_IN_TAU,
    SLOPE,
    TPP,
    WEIGHT,
    ZERO_THRESHOLD,
    Quantity,
    shown,
)
from engine.run_lengths import MOST_RUNS, run_lengths
from engine.study import Study, check_shares, study_from
from engine.version import VERSION

__all__ = [
    "LIMIT_KEYS",
    "MOST_POINTS",
    "NAME_LENGTH",
    "NOTE_LENGTH",
    "SHORTLIST_SCHEMA",
    "Point",
    "dump_shortlist",
    "keep",
    "load_shortlist",
]

SHORTLIST_SCHEMA = "sparsereach/shortlist/1"
MOST_POINTS = 200
NAME_LENGTH = 120
NOTE_LENGTH = 2000

NO_SCALE = (
    "a limit holds at every scale: multiply the normalised weights by tau and the calibration"
)

# Limits at the point's TPP, by their key in the file and the key of the penalty.
LIMIT_KEYS = {key.replace("-", "_"): key for key in FAMILIES}


@dataclass(frozen=True)
class Point:
    """One operating point; `data` is the point as the file holds it, already checked."""

    data: dict[str, Any]
    study: Study

    @property
    def name(self) -> str:
        """What the user calls it."""
        return str(self.data["name"])

    @property
    def note(self) -> str:
        """What the user wrote beside it."""
        return str(self.data["note"])

    @property
    def penalty(self) -> str:
        """Key of the penalty in `FAMILIES`."""
        return str(self.data["penalty"]["family"])

    @property
    def tpp(self) -> float:
        """Predicted TPP."""
        return float(self.data["predicted"]["tpp"])

    @property
    def fdp(self) -> float:
        """Predicted FDP."""
        return float(self.data["predicted"]["fdp"])

    def limit(self, key: str) -> float:
        """A limit at the point's TPP, by its key in the file; nan where there is none."""
        value = self.data["limits"][key]
        return math.nan if value is None else float(value)

    def renamed(self, name: str, note: str) -> "Point":
        """Return the point under another name and note."""
        check_text(name, "name", NAME_LENGTH)
        check_text(note, "note", NOTE_LENGTH)
        return replace(self, data={**self.data, "name": name, "note": note})


def keep(study: Study, penalty: str, tpp: float, name: str = "", note: str = "") -> Point:
    """Return the operating point of lowest FDP that a penalty can have at a TPP.

    Raises
    ------
    ValueError
        If the penalty is unknown, the TPP out of its interval, or the penalty has no point
        there.

    Examples
    --------
    >>> from engine.shortlist import keep
    >>> from engine.study import Effect, Study
    >>> study = Study("Blends", 600, 2000, 400, 1.0, (Effect(0.2, 1.0),))
    >>> round(keep(study, "sorted-l1", 0.8).fdp, 3)
    0.711
    """
    found = witness(penalty, tpp, study.sampling_ratio, study.sparsity)
    data = {
        "name": check_text(name, "name", NAME_LENGTH),
        "note": check_text(note, "note", NOTE_LENGTH),
        "page": "reach",
        "study": study.to_dict(),
        "penalty": _penalty(found),
        "selection": "nonzero",
        "strength": {
            "zero_threshold": found.zero_threshold,
            "calibration": found.calibration,
            "lambda": None,
            "lambda_per_run": None,
            "reason": NO_SCALE,
        },
        "predicted": {"tpp": found.tpp, "fdp": found.fdp},
        "rehearsed": None,
        "limits": _limits(found),
        "witness": _witness(found),
        "weights": {
            "unit": "tau",
            "normalised": list(map(list, run_lengths(found.profile, study.candidates))),
        },
        "version": VERSION,
    }
    return Point(data, study)


def dump_shortlist(points: tuple[Point, ...]) -> str:
    """Return the text of a shortlist's file."""
    return dump({"schema": SHORTLIST_SCHEMA, "points": [point.data for point in points]})


def load_shortlist(content: bytes | str) -> tuple[Point, ...]:
    """Return the points in a file's content, all of them or none.

    Raises
    ------
    ValueError
        Names the place of the first wrong field, the rule and the value.
    """
    data = parse(content, SHORTLIST_BYTES, "shortlist file")
    if data.get("schema", SHORTLIST_SCHEMA) != SHORTLIST_SCHEMA:
        raise ValueError(f"schema must be {SHORTLIST_SCHEMA!r}, not {shown(data['schema'])}")
    check_keys(data, "", ("schema", "points"))
    points = check_list(data["points"], "points", 0, MOST_POINTS)
    return tuple(_point(entry, f"points[{i}]") for i, entry in enumerate(points))


# ---- making a point


def _penalty(found: Witness) -> dict[str, Any]:
    penalty: dict[str, Any] = {"family": found.penalty}
    if found.levels is not None:
        penalty |= {"levels": list(found.levels), "share": found.level_share}
    return penalty


def _limits(found: Witness) -> dict[str, float | None]:
    delta, eps = found.sampling_ratio, found.sparsity
    values = {
        key: float(FAMILIES[family].boundary(found.tpp, delta, eps))
        for key, family in LIMIT_KEYS.items()
    }
    return {
        "critical_sparsity": critical_sparsity(delta),
        "power_limit": power_limit(delta, eps),
        **{key: None if math.isnan(value) else value for key, value in values.items()},
    }


def _witness(found: Witness) -> dict[str, Any]:
    return {
        "law": [
            {"size": size if math.isfinite(size) else OUTGROWS, "share": share}
            if size > 0.0
            else {"size": VANISHES, "share": share}
            for size, share in zip(found.law.sizes, found.law.shares, strict=True)
            if share > 0.0
        ],
        "risk": found.risk,
        "slope": found.slope,
        "attained": not found.approached,
        "reason": found.approached,
        "resolved": found.resolved,
    }


VANISHES = "tends to 0"
OUTGROWS = "outgrows tau"


# ---- checking a point

_POINT_KEYS = (
    "name", "note", "page", "study", "penalty", "selection", "strength", "predicted",
    "rehearsed", "limits", "witness", "weights", "version",
)  # fmt: skip
_STRENGTH_KEYS = ("zero_threshold", "calibration", "lambda", "lambda_per_run", "reason")
_WITNESS_KEYS = ("law", "risk", "slope", "attained", "reason", "resolved")


def _point(data: Any, where: str) -> Point:
    check_keys(data, where, _POINT_KEYS)
    check_text(data["name"], f"{where}.name", NAME_LENGTH)
    check_text(data["note"], f"{where}.note", NOTE_LENGTH)
    check_text(data["version"], f"{where}.version", 40)
    _check_word(data["page"], f"{where}.page", ("reach",))
    _check_word(data["selection"], f"{where}.selection", ("nonzero",))
    study = study_from(data["study"], f"{where}.study")
    _check_penalty(data["penalty"], f"{where}.penalty")
    _check_strength(data["strength"], f"{where}.strength")
    check_keys(data["predicted"], f"{where}.predicted", ("tpp", "fdp"))
    TPP.check(data["predicted"]["tpp"], f"{where}.predicted.tpp")
    _check_fdp(data["predicted"]["fdp"], f"{where}.predicted.fdp")
    if data["rehearsed"] is not None:
        raise ValueError(f"{where}.rehearsed must be null, not {shown(data['rehearsed'])}")
    _check_limits(data["limits"], f"{where}.limits")
    _check_within(data, where)
    _check_witness(data["witness"], f"{where}.witness")
    _check_weights(data["weights"], f"{where}.weights", study.candidates)
    return Point(data, study)


def _check_word(value: Any, where: str, known: tuple[str, ...]) -> None:
    if value not in known:
        raise ValueError(f"{where} must be {' or '.join(map(repr, known))}, not {shown(value)}")


def _check_penalty(data: Any, where: str) -> None:
    check_keys(data, where, ("family",), ("levels", "share"))
    kept = tuple(key for key, family in FAMILIES.items() if family.witness is not None)
    _check_word(data["family"], f"{where}.family", kept)
    if data["family"] != "two-level":
        check_keys(data, where, ("family",))
        return
    check_keys(data, where, ("family", "levels", "share"))
    levels = check_list(data["levels"], f"{where}.levels", 2, 2)
    values = [ZERO_THRESHOLD.check(level, f"{where}.levels") for level in levels]
    if values[0] < values[1]:
        raise ValueError(f"{where}.levels must not rise, not {shown(levels)}")
    CALIBRATION.check(data["share"], f"{where}.share")


def _check_strength(data: Any, where: str) -> None:
    check_keys(data, where, _STRENGTH_KEYS)
    ZERO_THRESHOLD.check(data["zero_threshold"], f"{where}.zero_threshold")
    CALIBRATION.check(data["calibration"], f"{where}.calibration")
    check_text(data["reason"], f"{where}.reason", NOTE_LENGTH)
    for key in ("lambda", "lambda_per_run"):
        if data[key] is not None:
            raise ValueError(f"{where}.{key} must be null, not {shown(data[key])}")


def _check_fdp(value: Any, where: str) -> None:
    """A predicted FDP may round to 0, which no target may be."""
    if value != 0 or isinstance(value, bool):
        FDP.check(value, where)


def _check_limits(data: Any, where: str) -> None:
    check_keys(data, where, ("critical_sparsity", "power_limit", *LIMIT_KEYS))
    CRITICAL_SPARSITY.check(data["critical_sparsity"], f"{where}.critical_sparsity")
    POWER_LIMIT.check(data["power_limit"], f"{where}.power_limit")
    for key in LIMIT_KEYS:
        if data[key] is not None:
            _check_fdp(data[key], f"{where}.{key}")


def _check_within(data: dict[str, Any], where: str) -> None:
    """Refuse a prediction below the limit of its own penalty, or where that has none."""
    key = data["penalty"]["family"].replace("-", "_")
    fdp, lowest = data["predicted"]["fdp"], data["limits"][key]
    if lowest is None or fdp < lowest:
        least = "null" if lowest is None else shown(lowest)
        raise ValueError(
            f"{where}.predicted.fdp must be at least limits.{key} ({least}), not {shown(fdp)}"
        )


def _check_witness(data: Any, where: str) -> None:
    check_keys(data, where, _WITNESS_KEYS)
    law = check_list(data["law"], f"{where}.law", 1, 3)
    for i, atom in enumerate(law):
        check_keys(atom, f"{where}.law[{i}]", ("size", "share"))
        if atom["size"] not in (VANISHES, OUTGROWS):
            SIZE_IN_TAU.check(atom["size"], f"{where}.law[{i}].size")
        SHARE.check(atom["share"], f"{where}.law[{i}].share")
    check_shares([atom["share"] for atom in law], f"{where}.law")
    RISK.check(data["risk"], f"{where}.risk")
    SLOPE.check(data["slope"], f"{where}.slope")
    check_text(data["reason"], f"{where}.reason", NOTE_LENGTH)
    for key in ("attained", "resolved"):
        if not isinstance(data[key], bool):
            raise ValueError(f"{where}.{key} must be true or false, not {shown(data[key])}")


def _check_weights(data: Any, where: str, candidates: int) -> None:
    check_keys(data, where, ("unit", "normalised"))
    _check_word(data["unit"], f"{where}.unit", ("tau",))
    where += ".normalised"
    pairs = check_list(data["normalised"], where, 1, MOST_RUNS)
    last, total = math.inf, 0
    for i, pair in enumerate(pairs):
        check_list(pair, f"{where}[{i}]", 2, 2)
        value = WEIGHT.check(pair[0], f"{where}[{i}][0]")
        total += int(_COUNT.check(pair[1], f"{where}[{i}][1]"))
        if value >= last:
            raise ValueError(
                f"{where}[{i}][0] must be below the one before, not {shown(value)}"
            )
        last = value
    if total != candidates:
        raise ValueError(f"{where} must count {candidates} candidates, not {total}")


_COUNT = Quantity("count", "Count", "", "count", "Ranks with this weight", 1, 1e9, whole=True)
