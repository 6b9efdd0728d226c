"""One session: what the user has set, what follows from it, and what they have kept.

Views read a Session and call its verbs; they never set its parameters themselves. A change is
checked as a whole before any of it is taken; a bad one leaves everything as it was and becomes
`problem`.
"""

import base64
import dataclasses
import math
from typing import Any

import param

from app.evaluation import Evaluate
from app.reach import Curves, Reach, Target, swift_curves, swift_reach
from app.ready import asset
from app.words import computed, typed
from engine.files import SHORTLIST_BYTES, STUDY_BYTES
from engine.limits.atlas import Atlas
from engine.limits.families import FAMILIES
from engine.quantities import QUANTITIES, SAMPLING_RATIO, SPARSITY
from engine.shortlist import MOST_POINTS, Point, dump_shortlist, keep, load_shortlist
from engine.study import (
    TITLE_LENGTH,
    Effect,
    Study,
    check_actives,
    load_study,
)
from engine.study import Target as StudyTarget

__all__ = ["Problem", "Session", "point_letter"]


@dataclasses.dataclass(frozen=True)
class Problem:
    """What is wrong with the last change, and the field it was made in."""

    field: str
    message: str


# What a session believes until a study file says otherwise; Reach does not use it.
_BELIEF: dict[str, Any] = {"noise_sd": 1.0, "effects": (Effect(size=0.2, share=1.0),)}

_COUNTS = ("runs", "candidates", "actives")
# The count that a ratio, times the candidates, stands for.
_COUNT_OF = {SAMPLING_RATIO.name: "runs", SPARSITY.name: "actives"}


class Session(param.Parameterized):
    """The state of one window.

    Parameters
    ----------
    evaluate : callable
        Called with (target, done) when exact values are wanted, target being the arguments of
        `app.reach.exact_reach`; calls `done(reach, curves)` later, on the session's own loop.
    """

    title = param.String()
    runs = param.Integer(default=None, allow_None=True)
    candidates = param.Integer(default=None, allow_None=True)
    actives = param.Integer(default=None, allow_None=True)
    tpp = param.Number(default=0.8)
    fdp = param.Number(default=0.2)

    keeps_counts = param.Boolean(default=True, doc="What new candidates leave as it is.")
    shown = param.Parameter(default=tuple(FAMILIES), doc="Penalties whose curves are drawn.")
    hatched = param.String(default="lasso", doc="The penalty whose closed region is hatched.")
    kept_as = param.String(default="sorted-l1", doc="The penalty that a point is kept for.")
    theme = param.String(default="light")

    problem = param.Parameter(default=None, doc="What is wrong with the last change, or None.")
    accepted = param.Integer(default=0, doc="Rises when a change was accepted.")
    notice = param.String(doc="What the last verb did.")
    reach = param.ClassSelector(default=None, class_=Reach, allow_None=True)
    curves = param.ClassSelector(default=None, class_=Curves, allow_None=True)
    points = param.Parameter(default=())

    def __init__(self, evaluate: Evaluate, atlas: Atlas | None = None, **params: Any) -> None:
        super().__init__(**params)
        self._atlas = atlas
        self.typed: frozenset[str] = frozenset()  # fields of the last change that held texts
        self._evaluate = evaluate
        self._belief = dict(_BELIEF)
        self._before: tuple[Point, ...] | None = None  # the points before the last change

    # ---- the study and its target

    def propose(self, changes: dict[str, Any]) -> None:
        """Take new values of fields (numbers, or texts as typed), all of them or none."""
        field = next(iter(changes))
        self.typed = frozenset(
            name for name, value in changes.items() if isinstance(value, str)
        )
        try:
            values = self._read(changes)
        except ValueError as error:
            self.problem = Problem(field, str(error))
            return
        self._take(values)

    def open_study(self, study: Study) -> None:
        """Take everything from `study`; its target too, when it has one."""
        self._belief = {"noise_sd": study.noise_sd, "effects": study.effects}
        values = {name: getattr(study, name) for name in _COUNTS} | {"title": study.title}
        if study.target is not None:
            values |= {"tpp": study.target.tpp, "fdp": study.target.fdp}
        self._take(values)

    def study(self) -> Study | None:
        """Return the study as it stands; None while a count is missing."""
        counts = {name: getattr(self, name) for name in _COUNTS}
        if None in counts.values():
            return None
        target = StudyTarget(tpp=self.tpp, fdp=self.fdp)
        return Study(title=self.title, **counts, **self._belief, target=target)

    def open_example(self) -> None:
        """Open the demo study."""
        self.open_study(load_study(asset("demo-study.json")))

    def open_file(self, upload: dict[str, Any]) -> None:
        """Open the study file that the browser read, or say what is wrong with it."""
        try:
            study = load_study(_uploaded(upload, STUDY_BYTES, "study file"))
        except ValueError as error:
            self.problem = Problem("file", f"{upload['name']}: {error}")
            return
        self.open_study(study)

    def rename_study(self, title: str) -> None:
        """Give the study another title."""
        self.title = title.strip()[:TITLE_LENGTH]

    def keep_counts(self, counts: bool) -> None:
        """Choose what a change of the candidates leaves as it is: counts or ratios."""
        self.keeps_counts = counts

    def show(self, penalty: str, shown: bool) -> None:
        """Show or hide a penalty's curve."""
        wanted = {*self.shown, penalty} if shown else set(self.shown) - {penalty}
        self.shown = tuple(key for key in FAMILIES if key in wanted)

    def hatch(self, penalty: str) -> None:
        """Hatch where `penalty` cannot get."""
        if penalty in FAMILIES:
            self.hatched = penalty

    def keep_as(self, penalty: str) -> None:
        """Choose the penalty that a point is kept for: one that has a witness."""
        if penalty in FAMILIES and FAMILIES[penalty].witness is not None:
            self.kept_as = penalty

    def turn_theme(self) -> None:
        """Change between light and dark."""
        self.theme = "dark" if self.theme == "light" else "light"

    # ---- the shortlist

    def cannot_keep(self) -> str:
        """Why the penalty to keep has no point at the target's TPP; empty when it has one."""
        if self.reach is None:
            return "runs, candidates and actives come first"
        if self.kept_as == "lasso" and math.isnan(self.reach.lowest["lasso"]):
            return f"no lasso has TPP {typed(self.tpp)}: its power limit is lower"
        return ""

    def keep_point(self) -> None:
        """Keep the point of lowest FDP that the penalty has at the target's TPP."""
        study = self.study()
        if study is None or self.cannot_keep():
            return
        if len(self.points) >= MOST_POINTS:
            self.notice = f"A shortlist holds at most {MOST_POINTS} points."
            return
        label = FAMILIES[self.kept_as].label
        name = f"{label[0].upper()}{label[1:]} at TPP {typed(self.tpp)}"
        point = keep(study, self.kept_as, self.tpp, name)
        letter = point_letter(len(self.points))
        notice = (
            f"Kept as {letter}: {label}, TPP {typed(point.tpp)}, FDP {computed(point.fdp)}."
        )
        self._set_points((*self.points, point), notice)

    def remove(self, index: int) -> None:
        """Remove a kept point."""
        if not 0 <= index < len(self.points):
            return
        rest = self.points[:index] + self.points[index + 1 :]
        self._set_points(rest, f"{self.points[index].name} removed.")

    def undo(self) -> None:
        """Take the last change of the shortlist back."""
        if self._before is not None:
            self.param.update(points=self._before, notice="")
            self._before = None

    def import_points(self, upload: dict[str, Any]) -> None:
        """Add the points of the shortlist file that the browser read: all of them or none."""
        try:
            new = load_shortlist(_uploaded(upload, SHORTLIST_BYTES, "shortlist file"))
            total = len(self.points) + len(new)
            if total > MOST_POINTS:
                raise ValueError(f"points must be at most {MOST_POINTS} in all, not {total}")
        except ValueError as error:
            self.problem = Problem("file", f"{upload['name']}: {error}")
            return
        added = [point for point in new if point not in self.points]
        same = len(new) - len(added)
        notice = f"{len(added)} added" + (f", {same} already there." if same else ".")
        self.problem = None
        self._set_points((*self.points, *added), notice)

    def exported(self) -> str:
        """Return the text of the shortlist's file."""
        return dump_shortlist(self.points)

    def kept_marks(self) -> list[tuple[str, float, float, float]]:
        """Return letter, TPP, FDP and target FDP of the points kept on the study as it stands.

        The target is the point's own FDP where that reaches it: then no stem joins the two.
        """
        marks = []
        for i, point in enumerate(self.points):
            kept = (point.study.sampling_ratio, point.study.sparsity)
            if self.reach is not None and kept == self.reach.study_ratios:
                target = point.study.target
                missed = (
                    target is not None and target.tpp == point.tpp and target.fdp < point.fdp
                )
                aimed = target.fdp if missed else point.fdp
                marks.append((point_letter(i), point.tpp, point.fdp, aimed))
        return marks

    # ---- workings

    def _read(self, changes: dict[str, Any]) -> dict[str, Any]:
        values = {name: _number(name, value) for name, value in changes.items()}
        candidates = values.get("candidates", self.candidates)
        for name, count in _COUNT_OF.items():
            if name in values:
                values[count] = _as_count(name, values.pop(name), candidates)
        if "candidates" in values and self.candidates and not self.keeps_counts:
            for count in ("runs", "actives"):
                old = getattr(self, count)
                if old is not None and count not in values:
                    values[count] = max(1, round(old * candidates / self.candidates))
        actives = values.get("actives", self.actives)
        if actives is not None and candidates is not None:
            check_actives(actives, candidates)
        return values

    def _take(self, values: dict[str, Any]) -> None:
        after = {
            name: values.get(name, getattr(self, name)) for name in (*_COUNTS, "tpp", "fdp")
        }
        changes: dict[str, Any] = {"problem": None, "notice": ""}
        target: Target | None = None if None in after.values() else tuple(after.values())
        if target is not None:
            changes |= self._answer(target)
        self.param.update(**values, **changes, accepted=self.accepted + 1)
        if target is not None:
            self._evaluate(target, self._refine)

    def _answer(self, target: Target) -> dict[str, Any]:
        """Return what can be shown at once: curves without a search, and what they tell."""
        runs, candidates, actives = target[:3]
        ratios = (runs / candidates, actives / candidates)
        if self.reach is not None and self.reach.study_ratios == ratios:
            return {"reach": swift_reach(target, self.curves)}
        curves = swift_curves(*ratios, self._atlas)
        return {"reach": swift_reach(target, curves), "curves": curves}

    def _set_points(self, points: tuple[Point, ...], notice: str) -> None:
        self._before = self.points
        self.param.update(points=points, notice=notice)

    def _refine(self, reach: Reach, curves: Curves) -> None:
        changes: dict[str, Any] = {"reach": reach}
        if not self.curves.exact:
            changes["curves"] = curves
        self.param.update(**changes)


def point_letter(index: int) -> str:
    """Name the kept points A to Z, then A2, B2 and so on."""
    turn, place = divmod(index, 26)
    return chr(ord("A") + place) + (str(turn + 1) if turn else "")


def _uploaded(upload: dict[str, Any], limit: int, what: str) -> bytes:
    """The bytes of an upload; one that the browser found too large arrives without them."""
    if upload["size"] > limit:
        most, size = f"{limit / 1e6:.0f} MB", f"{upload['size'] / 1e6:.9g} MB"
        raise ValueError(f"{what} must be at most {most}, not {size}")
    return base64.b64decode(upload["content"])


def _number(name: str, value: Any) -> float:
    """Return a typed text, or a number from the browser, checked by its quantity's rule."""
    quantity = QUANTITIES[name]
    if isinstance(value, str):
        text = value.strip().replace("\u202f", "").replace("\u00a0", "").replace(" ", "")
        try:
            value = int(text) if quantity.whole else float(text)
        except ValueError:
            value = value.strip()
    return quantity.check(value)


def _as_count(name: str, ratio: float, candidates: int | None) -> int:
    if candidates is None:
        raise ValueError(f"{name} needs candidates first")
    return QUANTITIES[_COUNT_OF[name]].check(max(1, round(ratio * candidates)))
