"""The study a user plans: counts, noise, effects and a target, and its file.

The file is JSON with the schema name 'sparsereach/study/1'; its JSON Schema lies beside the
demo study in assets/.
"""

import math
from dataclasses import dataclass
from typing import Any, ClassVar

from engine.files import STUDY_BYTES, check_keys, check_list, check_text, dump, parse
from engine.quantities import (
    ACTIVES,
    CANDIDATES,
    EFFECT_SCALE,
    EFFECT_SIZE,
    FDP,
    NOISE_SD,
    RUNS,
    SHARE,
    TPP,
    shown,
)

__all__ = [
    "MOST_EFFECTS",
    "SPREADS",
    "STUDY_SCHEMA",
    "TITLE_LENGTH",
    "Effect",
    "Spread",
    "Study",
    "Target",
    "check_actives",
    "check_shares",
    "effects_from",
    "load_study",
    "study_from",
]

STUDY_SCHEMA = "sparsereach/study/1"
SPREADS = ("normal", "exponential")
TITLE_LENGTH = 200
MOST_EFFECTS = 100

# The shares of the effects sum to 1 up to rounding in a few decimals.
_SHARE_SLACK = 1e-9


@dataclass(frozen=True)
class Effect:
    """One size of effect, per standard deviation of its column, and the share that has it."""

    size: float
    share: float

    def to_dict(self) -> dict[str, Any]:
        """Return the effect as the file holds it."""
        return {"size": self.size, "share": self.share}


@dataclass(frozen=True)
class Spread:
    """Effects spread by a normal or an exponential law of this scale."""

    spread: str
    scale: float
    share: float

    def to_dict(self) -> dict[str, Any]:
        """Return the spread as the file holds it."""
        return {"spread": self.spread, "scale": self.scale, "share": self.share}


@dataclass(frozen=True)
class Target:
    """The TPP wanted at least, at an FDP at most."""

    tpp: float
    fdp: float


@dataclass(frozen=True)
class Study:
    """A study in the user's units; `study_from` and `load_study` build and check it."""

    title: str
    runs: int
    candidates: int
    actives: int
    noise_sd: float
    effects: tuple[Effect | Spread, ...]
    target: Target | None = None

    schema: ClassVar[str] = STUDY_SCHEMA

    @property
    def sampling_ratio(self) -> float:
        """Runs per candidate."""
        return self.runs / self.candidates

    @property
    def sparsity(self) -> float:
        """Actives per candidate."""
        return self.actives / self.candidates

    def to_dict(self) -> dict[str, Any]:
        """Return the study as its file holds it."""
        data = {
            "schema": self.schema,
            "title": self.title,
            "runs": self.runs,
            "candidates": self.candidates,
            "actives": self.actives,
            "noise_sd": self.noise_sd,
            "effects": [effect.to_dict() for effect in self.effects],
        }
        if self.target is not None:
            data["target"] = {"tpp": self.target.tpp, "fdp": self.target.fdp}
        return data

    def dumps(self) -> str:
        """Return the text of the study's file."""
        return dump(self.to_dict())


def load_study(content: bytes | str) -> Study:
    """Return the study in a file's content.

    Raises
    ------
    ValueError
        Names the field, the rule and the value.

    Examples
    --------
    >>> from engine.study import load_study
    >>> study = load_study('''{"schema": "sparsereach/study/1", "title": "Pilot", "runs": 600,
    ...     "candidates": 2000, "actives": 100, "noise_sd": 1.0,
    ...     "effects": [{"size": 0.2, "share": 1.0}]}''')
    >>> study.sampling_ratio, study.sparsity
    (0.3, 0.05)
    """
    return study_from(parse(content, STUDY_BYTES, "study file"))


def study_from(data: Any, where: str = "") -> Study:
    """Return the study that a JSON value describes; `where` is its place in a larger file."""
    at = f"{where}." if where else ""
    required = ("schema", "runs", "candidates", "actives", "noise_sd", "effects")
    if isinstance(data, dict) and data.get("schema", STUDY_SCHEMA) != STUDY_SCHEMA:
        raise ValueError(f"{at}schema must be {STUDY_SCHEMA!r}, not {shown(data['schema'])}")
    check_keys(data, where, required, ("title", "target"))
    counts = {
        quantity.name: int(quantity.check(data[quantity.name], at + quantity.name))
        for quantity in (RUNS, CANDIDATES, ACTIVES)
    }
    check_actives(counts["actives"], counts["candidates"], at)
    return Study(
        title=check_text(data.get("title", ""), at + "title", TITLE_LENGTH),
        **counts,
        noise_sd=NOISE_SD.check(data["noise_sd"], at + "noise_sd"),
        effects=effects_from(data["effects"], at + "effects"),
        target=_target(data["target"], at + "target") if "target" in data else None,
    )


def check_actives(actives: int, candidates: int, at: str = "") -> None:
    """Refuse actives that are not fewer than the candidates."""
    if actives >= candidates:
        raise ValueError(
            f"{at}actives must be smaller than candidates ({candidates}), not {actives}"
        )


def check_shares(shares: list[float], where: str) -> None:
    """Refuse shares that do not sum to 1."""
    total = math.fsum(shares)
    if abs(total - 1.0) > _SHARE_SLACK:
        raise ValueError(f"{where} must have shares that sum to 1, not {total:.10g}")


def effects_from(data: Any, where: str = "effects") -> tuple[Effect | Spread, ...]:
    """Return the effects that a JSON value describes."""
    effects = tuple(
        _effect(entry, f"{where}[{i}]")
        for i, entry in enumerate(check_list(data, where, 1, MOST_EFFECTS))
    )
    check_shares([effect.share for effect in effects], where)
    return effects


def _effect(data: Any, where: str) -> Effect | Spread:
    if isinstance(data, dict) and "spread" in data:
        check_keys(data, where, ("spread", "scale", "share"))
        if data["spread"] not in SPREADS:
            words = " or ".join(map(repr, SPREADS))
            raise ValueError(f"{where}.spread must be {words}, not {shown(data['spread'])}")
        scale = EFFECT_SCALE.check(data["scale"], f"{where}.scale")
        return Spread(data["spread"], scale, SHARE.check(data["share"], f"{where}.share"))
    check_keys(data, where, ("size", "share"))
    size = EFFECT_SIZE.check(data["size"], f"{where}.size")
    return Effect(size, SHARE.check(data["share"], f"{where}.share"))


def _target(data: Any, where: str) -> Target:
    check_keys(data, where, ("tpp", "fdp"))
    return Target(
        TPP.check(data["tpp"], f"{where}.tpp"), FDP.check(data["fdp"], f"{where}.fdp")
    )
