"""One session: what the user has set, what follows from it, and what they have kept.

Views read a Session and call its verbs; they never set its parameters themselves. A change is
checked as a whole before any of it is taken; a bad one leaves everything as it was and becomes
`problem`.
"""

import dataclasses
import math
from typing import Any

import param

from app.evaluation import Evaluate
from app.kept import Kept, Mark, marks
from app.reach import Curves, Needs, Reach, Target, swift_curves, swift_needs, swift_reach
from app.ready import asset
from app.siblings import Siblings, siblings
from app.upload import uploaded
from app.words import typed
from engine.files import STUDY_BYTES
from engine.limits.atlas import Atlas
from engine.limits.contours import Contours
from engine.limits.families import FAMILIES
from engine.limits.nearest import KEEPING, reachable_tpp
from engine.quantities import QUANTITIES, SAMPLING_RATIO, SPARSITY
from engine.study import (
    TITLE_LENGTH,
    Effect,
    Study,
    check_actives,
    effects_from,
    load_study,
)
from engine.study import Target as StudyTarget

__all__ = ["Problem", "Session"]


@dataclasses.dataclass(frozen=True)
class Problem:
    """What is wrong with the last change, and the field it was made in."""

    field: str
    message: str


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

    # Believed until a study says otherwise; Reach does not use them.
    noise_sd = param.Number(default=1.0)
    effects = param.Parameter(default=(Effect(size=0.2, share=1.0),))

    keeps_counts = param.Boolean(default=True, doc="What new candidates leave as it is.")
    shown = param.Parameter(default=tuple(FAMILIES), doc="Penalties whose curves are drawn.")
    hatched = param.String(default="lasso", doc="The penalty whose closed region is hatched.")
    kept_as = param.String(default="sorted-l1", doc="The penalty that a point is kept for.")
    keeping = param.String(default="tpp", doc="What is kept of a target out of reach.")
    theme = param.String(default="light")

    problem = param.Parameter(default=None, doc="What is wrong with the last change, or None.")
    accepted = param.Integer(default=0, doc="Rises when a change was accepted.")
    reach = param.ClassSelector(default=None, class_=Reach, allow_None=True)
    curves = param.ClassSelector(default=None, class_=Curves, allow_None=True)
    needs = param.ClassSelector(default=None, class_=Needs, allow_None=True)
    siblings = param.ClassSelector(default=None, class_=Siblings, allow_None=True)

    def __init__(
        self,
        evaluate: Evaluate,
        atlas: Atlas | None = None,
        contours: Contours | None = None,
        **params: Any,
    ) -> None:
        super().__init__(**params)
        self.kept = Kept()
        self._atlas, self._contours = atlas, contours
        self.typed: frozenset[str] = frozenset()  # fields of the last change that held texts
        self._evaluate = evaluate
        self._aim: tuple[float, float] | None = None  # the target that `needs` stands for

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
        names = (*_COUNTS, "title", "noise_sd", "effects")
        values: dict[str, Any] = {name: getattr(study, name) for name in names}
        if study.target is not None:
            values |= {"tpp": study.target.tpp, "fdp": study.target.fdp}
        self._take(values)

    def believe(self, effects: list[dict[str, Any]]) -> None:
        """Take a list of effects as a study file holds it (numbers, or texts as typed)."""
        rows = [
            {key: _typed_number(value) for key, value in effect.items()} for effect in effects
        ]
        try:
            believed = effects_from(rows)
        except ValueError as error:
            self.problem = Problem("effects", str(error))
            return
        self._take({"effects": believed})

    def study(self) -> Study | None:
        """Return the study as it stands; None while a count is missing."""
        counts = {name: getattr(self, name) for name in _COUNTS}
        if None in counts.values():
            return None
        target = StudyTarget(tpp=self.tpp, fdp=self.fdp)
        belief = {"noise_sd": self.noise_sd, "effects": self.effects}
        return Study(title=self.title, **counts, **belief, target=target)

    def open_example(self) -> None:
        """Open the demo study."""
        self.open_study(load_study(asset("demo-study.json")))

    def open_file(self, upload: dict[str, Any]) -> None:
        """Open the study file that the browser read, or say what is wrong with it."""
        try:
            study = load_study(uploaded(upload, STUDY_BYTES, "study file"))
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

    def turn_theme(self) -> None:
        """Change between light and dark."""
        self.theme = "dark" if self.theme == "light" else "light"

    # ---- the shortlist

    def keep_as(self, penalty: str) -> None:
        """Choose the penalty that a point is kept for: one that has a witness."""
        if penalty in FAMILIES and FAMILIES[penalty].witness is not None:
            self.kept_as = penalty

    def when_out(self, keeping: str) -> None:
        """Choose what is kept of a target out of reach."""
        if keeping in KEEPING:
            self.keeping = keeping

    def cannot_keep(self) -> str:
        """Why there is no point to keep; empty when there is one."""
        if self.reach is None:
            return "runs, candidates and actives come first"
        if self.keeping == "tpp" and math.isnan(self.reach.lowest[self.kept_as]):
            return f"no lasso has TPP {typed(self.tpp)}: its power limit is lower"
        return ""

    def keep_point(self) -> None:
        """Keep the point that the penalty has at the target, or that stands in for it."""
        study = self.study()
        if study is not None and not self.cannot_keep():
            ratios = (study.sampling_ratio, study.sparsity)
            tpp = reachable_tpp(self.kept_as, self.tpp, self.fdp, *ratios, self.keeping)
            self.kept.add(study, self.kept_as, tpp)

    def open_point(self, index: int) -> None:
        """Bring back the study, target and penalty of a kept point."""
        if 0 <= index < len(self.kept.points):
            point = self.kept.points[index]
            self.keep_as(point.penalty)
            self.open_study(point.study)

    def import_points(self, upload: dict[str, Any]) -> None:
        """Add the points of the shortlist file that the browser read, or say what is wrong."""
        try:
            self.kept.read(upload)
        except ValueError as error:
            self.problem = Problem("file", f"{upload['name']}: {error}")
        else:
            self.problem = None

    def marks(self) -> list[Mark]:
        """Return the marks of the points kept on the study as it stands."""
        return [] if self.reach is None else marks(self.kept.points, self.reach.study_ratios)

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
        changes: dict[str, Any] = {"problem": None}
        target: Target | None = None if None in after.values() else tuple(after.values())
        if target is not None:
            changes |= self._answer(target)
        self.param.update(**values, **changes, accepted=self.accepted + 1)
        self.kept.notice = ""
        if target is not None:
            self._evaluate(target, self._refine)

    def _answer(self, target: Target) -> dict[str, Any]:
        """Return what can be shown at once: curves without a search, and what they tell."""
        runs, candidates, actives, tpp, fdp = target
        ratios = (runs / candidates, actives / candidates)
        answer: dict[str, Any] = {}
        if self._contours is not None and (self.needs is None or (tpp, fdp) != self._aim):
            self._aim = (tpp, fdp)
            answer["needs"] = swift_needs(tpp, fdp, self._contours)
        curves = self.curves
        if self.reach is None or self.reach.study_ratios != ratios:
            answer["curves"] = curves = swift_curves(*ratios, self._atlas)
            if self._atlas is not None:
                answer["siblings"] = siblings(*ratios, self._atlas)
        return {**answer, "reach": swift_reach(target, curves)}

    def _refine(self, reach: Reach, curves: Curves) -> None:
        changes: dict[str, Any] = {"reach": reach}
        if not self.curves.exact:
            changes["curves"] = curves
        self.param.update(**changes)


def _number(name: str, value: Any) -> float:
    """Return a typed text, or a number from the browser, checked by its quantity's rule."""
    quantity = QUANTITIES[name]
    return quantity.check(_typed_number(value, quantity.whole))


def _typed_number(value: Any, whole: bool = False) -> Any:
    """Return the number that a text holds; other texts as they are, for a check to refuse."""
    if not isinstance(value, str):
        return value
    text = value.strip().replace("\u202f", "").replace("\u00a0", "").replace(" ", "")
    try:
        return int(text) if whole else float(text)
    except ValueError:
        return value.strip()


def _as_count(name: str, ratio: float, candidates: int | None) -> int:
    if candidates is None:
        raise ValueError(f"{name} needs candidates first")
    return QUANTITIES[_COUNT_OF[name]].check(max(1, round(ratio * candidates)))
