"""The rail: the study as counts and ratios, the target, the penalties."""

from typing import Any

from markupsafe import Markup

from app.afterwards import Afterwards
from app.coalesce import Coalescer
from app.components.control import Control
from app.components.sheet import Sheet
from app.state import Session
from engine.limits.families import FAMILIES
from engine.quantities import ACTIVES, CANDIDATES, FDP, RUNS, SAMPLING_RATIO, SPARSITY, TPP

__all__ = ["StudyRail"]

# Pointing devices send no more than this many counts a candidate: the ends of the sliders.
_PAIRS = {RUNS.name: SAMPLING_RATIO, ACTIVES.name: SPARSITY}


class StudyRail:
    """Controls of one session; they post changes and show what the session holds."""

    def __init__(self, session: Session, inbox: Coalescer, afterwards: Afterwards) -> None:
        self._session = session

        def post(data: dict[str, Any]) -> None:
            inbox.post(data["field"], data["value"] if "value" in data else str(data["text"]))

        self.controls = {
            CANDIDATES.name: Control(CANDIDATES, post),
            RUNS.name: Control(RUNS, post, ratio=SAMPLING_RATIO, scale=SAMPLING_RATIO.scale),
            ACTIVES.name: Control(ACTIVES, post, ratio=SPARSITY, scale=SPARSITY.scale),
            TPP.name: Control(TPP, post, hint="at least"),
            FDP.name: Control(FDP, post, hint="at most"),
        }
        self.keeping = Sheet("keeping", self._use)
        self.penalties = Sheet("penalties", self._use)
        self.caution = Sheet("caution", html=_CAUTION)
        later = afterwards.put_off
        session.param.watch(later(self._show_values), ["accepted"])
        session.param.watch(later(self._show_transition), ["reach"])
        session.param.watch(later(self._show_problem), ["problem"])
        session.param.watch(self._show_choices, ["keeps_counts", "shown", "hatched"])
        self._show_values()
        self._show_choices()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        return {
            **self.controls,
            "keeping": self.keeping,
            "penalties": self.penalties,
            "caution": self.caution,
        }

    def _use(self, data: dict[str, Any]) -> None:
        match data.get("do"):
            case "keep-counts":
                self._session.keep_counts(data.get("keeps") == "counts")
            case "show":
                self._session.show(str(data.get("penalty")), bool(data.get("value")))
            case "hatch":
                self._session.hatch(str(data.get("penalty")))

    def _show_values(self, *_: Any) -> None:
        session = self._session
        candidates = session.candidates
        for name, ratio in _PAIRS.items():
            changes: dict[str, Any] = {"value": getattr(session, name), "per": candidates}
            if candidates:
                low, high = ratio.slider
                changes["low"] = max(1, round(low * candidates))
                changes["high"] = max(2, round(high * candidates))
            self._update(name, changes)
        for name in (CANDIDATES.name, TPP.name, FDP.name):
            self._update(name, {"value": getattr(session, name)})

    def _show_transition(self, *_: Any) -> None:
        """Mark the transition on the slider of the actives, once the hand rests."""
        reach = self._session.reach
        if reach is not None and reach.exact:
            tick = reach.critical_sparsity * reach.candidates
            if self.controls[ACTIVES.name].tick != tick:
                self.controls[ACTIVES.name].tick = tick

    def _update(self, name: str, changes: dict[str, Any]) -> None:
        control = self.controls[name]
        changes = {
            key: value for key, value in changes.items() if getattr(control, key) != value
        }
        if changes or {name, control.per_field} & self._session.typed:
            control.param.update(**changes, accepted=self._session.accepted)

    def _show_problem(self, *_: Any) -> None:
        problem = self._session.problem
        for name, control in self.controls.items():
            ratio = _PAIRS.get(name)
            mine = problem is not None and problem.field in (name, ratio and ratio.name)
            error = (problem.message, problem.field) if mine else ("", "")
            if (control.error, control.error_field) != error:
                # Where another change was taken, what was wrong here is put right.
                accepted = self._session.accepted
                control.param.update(error=error[0], error_field=error[1], accepted=accepted)

    def _show_choices(self, *_: Any) -> None:
        session = self._session
        self.keeping.html = Markup(
            '<span>New candidates keep</span><span class="segments" role="group" '
            'aria-label="New candidates keep">{}{}</span>'
        ).format(
            _segment("counts", session.keeps_counts),
            _segment("ratios", not session.keeps_counts),
        )
        rows = Markup("").join(_penalty(session, key) for key in FAMILIES)
        self.penalties.html = Markup("<h2>Penalties<span>hatch</span></h2>{}").format(rows)


def _segment(word: str, pressed: bool) -> Markup:
    return Markup(
        '<button data-do="keep-counts" data-keeps="{0}" data-key="keep-{0}" '
        'aria-pressed="{1}">{0}</button>'
    ).format(word, str(pressed).lower())


def _penalty(session: Session, key: str) -> Markup:
    label = FAMILIES[key].label
    return Markup(
        '<div class="penalty"><label>'
        '<input type="checkbox" data-do="show" data-penalty="{key}" '
        'data-key="show-{key}" {checked}>'
        '<i class="sample {key}"></i>{label}</label>'
        '<button class="hatch {key}" data-do="hatch" data-penalty="{key}" '
        'data-key="hatch-{key}" aria-pressed="{hatched}" '
        'aria-label="Hatch where {label} cannot get"></button></div>'
    ).format(
        key=key,
        label=label,
        checked=Markup("checked") if key in session.shown else "",
        hatched=str(key == session.hatched).lower(),
    )


_CAUTION = Markup(
    "<p>Hatched: no signal, noise or strength lets that penalty in. Shaded: no sorted L1 gets "
    "in.</p><p>Large-sample limits for iid Gaussian columns; a finite study strays. Where a "
    "decision can hurt someone, a qualified statistician and local rules decide.</p>"
)
