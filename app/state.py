"""One session: what the user has set, what follows from it, and what they have kept.

Views read a Session and call its verbs; they never set its parameters themselves. A change is
checked as a whole before any of it is taken; a bad one leaves everything as it was and becomes
`problem`.
"""

import dataclasses
from typing import Any

import param

from app.evaluation import Evaluate
from app.reach import Curves, Reach, read_off, swift_curves, swift_reach
from engine.limits.families import FAMILIES
from engine.quantities import QUANTITIES, SAMPLING_RATIO, SPARSITY
from engine.study import Effect, Study, Target

__all__ = ["Problem", "Session"]


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
    shown = param.Tuple(default=tuple(FAMILIES))
    chosen = param.String(default="lasso", doc="The penalty hatched, and kept.")
    theme = param.String(default="light")

    problem = param.Parameter(default=None, doc="What is wrong with the last change, or None.")
    accepted = param.Integer(default=0, doc="Rises when a change was accepted.")
    notice = param.String(doc="What the last verb did.")
    reach = param.ClassSelector(default=None, class_=Reach, allow_None=True)
    curves = param.ClassSelector(default=None, class_=Curves, allow_None=True)
    points = param.Parameter(default=())

    def __init__(self, evaluate: Evaluate, **params: Any) -> None:
        super().__init__(**params)
        self.typed: frozenset[str] = frozenset()  # fields of the last change that held texts
        self._evaluate = evaluate
        self._belief = dict(_BELIEF)
        self._undo: tuple[Any, ...] | None = None

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
        target = Target(tpp=self.tpp, fdp=self.fdp)
        return Study(title=self.title, **counts, **self._belief, target=target)

    def rename_study(self, title: str) -> None:
        """Give the study another title."""
        self.title = title.strip()[:200]

    def keep_counts(self, counts: bool) -> None:
        """Choose what a change of the candidates leaves as it is: counts or ratios."""
        self.keeps_counts = counts

    def show(self, penalty: str, shown: bool) -> None:
        """Show or hide a penalty's curve."""
        wanted = {*self.shown, penalty} if shown else set(self.shown) - {penalty}
        self.shown = tuple(key for key in FAMILIES if key in wanted)

    def choose(self, penalty: str) -> None:
        """Choose the penalty that is hatched and kept."""
        if penalty in FAMILIES:
            self.chosen = penalty

    def turn_theme(self) -> None:
        """Change between light and dark."""
        self.theme = "dark" if self.theme == "light" else "light"

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
        if actives is not None and candidates is not None and actives >= candidates:
            raise ValueError(
                f"actives must be smaller than candidates ({candidates}), not {actives}"
            )
        return values

    def _take(self, values: dict[str, Any]) -> None:
        after = {
            name: values.get(name, getattr(self, name)) for name in (*_COUNTS, "tpp", "fdp")
        }
        changes: dict[str, Any] = {"problem": None, "notice": ""}
        if None not in after.values():
            changes |= self._answer(swift_reach(**after))
            self._evaluate(tuple(after.values()), self._refine)
        self.param.update(**values, **changes, accepted=self.accepted + 1)

    def _answer(self, swift: Reach) -> dict[str, Any]:
        """Return what can be shown at once: open values, or read off the curves that stand."""
        old = self.reach
        same = old is not None and old.study_ratios == swift.study_ratios
        if same and self.curves.exact:
            return {"reach": read_off(swift, self.curves)}
        if same:
            return {"reach": swift}
        return {"reach": swift, "curves": swift_curves(*swift.study_ratios)}

    def _refine(self, reach: Reach, curves: Curves) -> None:
        changes: dict[str, Any] = {"reach": reach}
        if not self.curves.exact:
            changes["curves"] = curves
        self.param.update(**changes)


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
