"""The JSON Schemas (draft 2020-12) of both files, made from the quantities.

`python -m engine.schemas FOLDER` writes them to a folder. What a schema cannot say (shares that
sum to 1, fewer actives than candidates, weights that fall) the loaders check.
"""

import json
import sys
from pathlib import Path
from typing import Any

from engine.limits.families import FAMILIES
from engine.quantities import (
    ACTIVES,
    CALIBRATION,
    CANDIDATES,
    CRITICAL_SPARSITY,
    EFFECT_SCALE,
    EFFECT_SIZE,
    FDP,
    NOISE_SD,
    POWER_LIMIT,
    RISK,
    RUNS,
    SHARE,
    SIZE_IN_TAU,
    SLOPE,
    TPP,
    WEIGHT,
    ZERO_THRESHOLD,
    Quantity,
)
from engine.run_lengths import MOST_RUNS
from engine.shortlist import (
    LIMIT_KEYS,
    MOST_POINTS,
    NAME_LENGTH,
    NOTE_LENGTH,
    OUTGROWS,
    SHORTLIST_SCHEMA,
    VANISHES,
)
from engine.study import MOST_EFFECTS, SPREADS, STUDY_SCHEMA, TITLE_LENGTH

__all__ = ["shortlist_schema", "study_schema", "write_schemas"]

_DRAFT = "https://json-schema.org/draft/2020-12/schema"


def study_schema() -> dict[str, Any]:
    """Return the schema of a study file."""
    return {"$schema": _DRAFT, "title": "sparsereach study", **_study()}


def shortlist_schema() -> dict[str, Any]:
    """Return the schema of a shortlist file."""
    points = {"type": "array", "maxItems": MOST_POINTS, "items": _point()}
    body = _object({"schema": {"const": SHORTLIST_SCHEMA}, "points": points})
    return {"$schema": _DRAFT, "title": "sparsereach shortlist", **body}


def write_schemas(folder: Path) -> None:
    """Write both schemas to `folder`."""
    for name, schema in (("study", study_schema()), ("shortlist", shortlist_schema())):
        text = json.dumps(schema, indent=1, ensure_ascii=False) + "\n"
        (folder / f"{name}.schema.json").write_text(text, encoding="utf-8")


def _object(required: dict[str, Any], optional: dict[str, Any] | None = None) -> dict[str, Any]:
    return {
        "type": "object",
        "properties": {**required, **(optional or {})},
        "required": list(required),
        "additionalProperties": False,
    }


def _text(most: int) -> dict[str, Any]:
    return {"type": "string", "maxLength": most}


def _by_name(*quantities: Quantity) -> dict[str, Any]:
    return {quantity.name: quantity.schema() for quantity in quantities}


def _or_null(schema: dict[str, Any]) -> dict[str, Any]:
    return {"anyOf": [schema, {"type": "null"}]}


def _study() -> dict[str, Any]:
    size = _object(_by_name(EFFECT_SIZE, SHARE))
    spread = _object({"spread": {"enum": list(SPREADS)}, **_by_name(EFFECT_SCALE, SHARE)})
    effects = {"type": "array", "minItems": 1, "maxItems": MOST_EFFECTS}
    return _object(
        {
            "schema": {"const": STUDY_SCHEMA},
            **_by_name(RUNS, CANDIDATES, ACTIVES, NOISE_SD),
            "effects": {**effects, "items": {"oneOf": [size, spread]}},
        },
        {"title": _text(TITLE_LENGTH), "target": _object(_by_name(TPP, FDP))},
    )


def _point() -> dict[str, Any]:
    fdp = {**FDP.schema(), "minimum": 0}  # a prediction may round to 0, a target may not be 0
    fdp.pop("exclusiveMinimum")
    null = {"type": "null"}
    count = {"type": "integer", "minimum": 1, "description": "Ranks with this weight"}
    return _object(
        {
            "name": _text(NAME_LENGTH),
            "note": _text(NOTE_LENGTH),
            "page": {"const": "reach"},
            "study": _study(),
            "penalty": _penalty(),
            "selection": {"const": "nonzero"},
            "strength": _object(
                {
                    **_by_name(ZERO_THRESHOLD, CALIBRATION),
                    "lambda": null,
                    "lambda_per_run": null,
                    "reason": _text(NOTE_LENGTH),
                }
            ),
            "predicted": _object({"tpp": TPP.schema(), "fdp": fdp}),
            "rehearsed": null,
            "limits": _object(
                {
                    **_by_name(CRITICAL_SPARSITY, POWER_LIMIT),
                    **{key: _or_null(fdp) for key in LIMIT_KEYS},
                }
            ),
            "witness": _witness(),
            "weights": _object(
                {
                    "unit": {"const": "tau"},
                    "normalised": {
                        "type": "array",
                        "minItems": 1,
                        "maxItems": MOST_RUNS,
                        "description": "Weights by rank from the top, as [value, count] pairs",
                        "items": {
                            "type": "array",
                            "prefixItems": [WEIGHT.schema(), count],
                            "minItems": 2,
                            "maxItems": 2,
                        },
                    },
                }
            ),
            "version": _text(40),
        }
    )


def _penalty() -> dict[str, Any]:
    single = [key for key, family in FAMILIES.items() if family.witness and key != "two-level"]
    levels = {
        "type": "array",
        "items": ZERO_THRESHOLD.schema(),
        "minItems": 2,
        "maxItems": 2,
        "description": "Normalised levels, the larger first",
    }
    share = {**CALIBRATION.schema(), "description": "Share of the ranks with the larger level"}
    two_level = {"family": {"const": "two-level"}, "levels": levels, "share": share}
    return {"oneOf": [_object({"family": {"enum": single}}), _object(two_level)]}


def _witness() -> dict[str, Any]:
    size = {"oneOf": [SIZE_IN_TAU.schema(), {"enum": [VANISHES, OUTGROWS]}]}
    atom = _object({"size": size, "share": SHARE.schema()})
    return _object(
        {
            "law": {"type": "array", "minItems": 1, "maxItems": 3, "items": atom},
            "risk": RISK.schema(),
            "slope": SLOPE.schema(),
            "attained": {"type": "boolean"},
            "reason": _text(NOTE_LENGTH),
            "resolved": {"type": "boolean"},
        }
    )


if __name__ == "__main__":
    write_schemas(Path(sys.argv[1]))
