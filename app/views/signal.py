"""The Signal page: what each penalty and rule gives for the signal the user believes in."""

import math
from typing import Any

import panel as pn
from bokeh.models import ColumnDataSource
from markupsafe import Markup

from app.afterwards import Afterwards
from app.coalesce import Coalescer
from app.components.control import Control
from app.components.sheet import Sheet
from app.gains_verdict import best_of, gains_verdict
from app.looking import Looking
from app.outlook import COMPARED, RULES
from app.plots.gains import STROKE_OF, GainsPlane
from app.state import Session
from app.theme import THEMES
from app.verdict import Piece
from app.words import computed, count, significant, typed
from engine.prediction import Prediction
from engine.quantities import NOISE_SD
from engine.study import Effect

__all__ = ["SignalView"]

_LABELS = {"lasso": "lasso", "two-level": "two-level", "ramp": "ramp", "designed": "designed"}


class SignalView:
    """Pictures, table and words of one session's Signal page, built once."""

    def __init__(
        self,
        session: Session,
        looking: Looking,
        inbox: Coalescer,
        afterwards: Afterwards,
        boundaries: ColumnDataSource,
    ) -> None:
        self._session, self._looking = session, looking
        self.plane = GainsPlane(boundaries)

        def post(data: dict[str, Any]) -> None:
            inbox.post(NOISE_SD.name, data["value"] if "value" in data else str(data["text"]))

        self.noise = Control(NOISE_SD, post)
        self.effects = Sheet("effects", self._use)
        self.gains_verdict = Sheet("sentence", live=True)
        self.gains_table = Sheet("gains", None)
        self.page = Sheet("pages", self._use)
        self.page.html = '<input type="hidden" data-do="page" data-key="page">'
        later = afterwards.put_off
        looking.param.watch(later(self._show), ["outlooks", "comparators"])
        session.param.watch(later(self._show_belief), ["accepted", "problem", "noise_sd"])
        session.param.watch(self._repaint, ["theme"])
        self._repaint()
        self._show_belief()
        self._show()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        return {
            "gains": pn.pane.Bokeh(self.plane.canvas.figure, sizing_mode="stretch_both"),
            "noise": self.noise,
            "effects": self.effects,
            "gains_verdict": self.gains_verdict,
            "gains_table": self.gains_table,
            "page": self.page,
        }

    # ---- what the user does

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        rows = [effect.to_dict() for effect in session.effects]
        index = int(data.get("index", 0))
        match data.get("do"):
            case "page":
                self._looking.open(data.get("value") == "signal")
                return
            case "kind" if data["kind"] == "list":
                rows = [Effect(0.2, 1.0).to_dict()]
            case "kind":
                rows = [{"spread": str(data["kind"]), "scale": 0.2, "share": 1.0}]
            case "add":
                rows = _added(rows)
            case "drop" if 0 <= index < len(rows) and len(rows) > 1:
                rows = _shared([row for i, row in enumerate(rows) if i != index])
            case "size" | "scale" | "share" if 0 <= index < len(rows):
                rows[index][str(data["do"])] = str(data["value"])
                if data["do"] == "share" and len(rows) == 2:
                    rows = _balanced(rows, index)
        session.believe(rows)

    # ---- what the session and the answers change

    def _show_belief(self) -> None:
        session = self._session
        if self.noise.value != session.noise_sd or NOISE_SD.name in session.typed:
            self.noise.param.update(value=session.noise_sd, accepted=session.accepted)
        problem = session.problem
        mine = problem is not None and problem.field == NOISE_SD.name
        self.noise.error = problem.message if problem is not None and mine else ""
        self.effects.html = _effects_html(session)

    def _show(self) -> None:
        session, looking = self._session, self._looking
        current = {
            family: looking.outlooks[family]
            for family in COMPARED
            if family in looking.outlooks and looking.is_current(looking.outlooks[family])
        }
        if current:
            self.plane.show(current, session.fdp)
            best = best_of(current)
            point = None if best is None else current[best[0]].points[best[1]]
            place = (math.nan, math.nan) if point is None else (point.tpp, point.fdp)
            self.plane.show_best(*place)
        self.gains_verdict.html = _verdict_html(session, looking)
        self.gains_table.html = _table(session, looking)

    def _repaint(self, *_: Any) -> None:
        self.plane.canvas.repaint(THEMES[self._session.theme])


def _added(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Add an effect half as large again as the last, and give all equal shares."""
    last = rows[-1]
    new = {"size": round(1.5 * abs(float(last["size"])), 3)} if "size" in last else dict(last)
    return _shared([*rows, new | {"share": 0.5}])


def _shared(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    even = round(1.0 / len(rows), 4)
    rest = [even] * (len(rows) - 1)
    shares = [*rest, 1.0 - sum(rest)]
    return [row | {"share": share} for row, share in zip(rows, shares, strict=True)]


def _balanced(rows: list[dict[str, Any]], index: int) -> list[dict[str, Any]]:
    """Of two effects the other one has the rest."""
    try:
        rest = round(1.0 - float(rows[index]["share"]), 12)
    except ValueError:
        return rows
    if 0.0 < rest < 1.0:
        rows[1 - index]["share"] = rest
    return rows


def _effects_html(session: Session) -> Markup:
    rows = Markup("").join(
        _effect_row(session, i, effect.to_dict()) for i, effect in enumerate(session.effects)
    )
    spread = "" if isinstance(session.effects[0], Effect) else session.effects[0].spread
    kinds = Markup("").join(
        Markup(
            '<button data-do="kind" data-kind="{0}" data-key="kind-{0}" aria-pressed="{1}">{2}'
            "</button>"
        ).format(kind, str(kind == (spread or "list")).lower(), word)
        for kind, word in (("list", "list"), ("normal", "normal"), ("exponential", "exp."))
    )
    problem = session.problem
    wrong = problem is not None and problem.field == "effects"
    told = problem.message if problem is not None and wrong else ""
    return Markup(
        '<div class="head"><h2>Effects</h2><span class="segments" role="group" '
        'aria-label="Kind of effects">{}</span></div>{}'
        '<p class="error-line" role="alert">{}</p>'
        '<button class="button" data-do="add" data-key="add">Add effect</button>'
    ).format(kinds, rows, told)


def _effect_row(session: Session, index: int, row: dict[str, Any]) -> Markup:
    """One effect: its size or scale, its share, and the z-score that it would have alone."""
    key = "size" if "size" in row else "scale"
    z = ""
    if session.runs is not None:
        z = f"{abs(row[key]) * math.sqrt(session.runs) / session.noise_sd:.1f}"
    return Markup(
        '<div class="effect"><label>{what}<input data-do="{key}" data-index="{i}" '
        'data-key="{key}-{i}" value="{value:g}" inputmode="decimal"></label>'
        '<label>share<input data-do="share" data-index="{i}" data-key="share-{i}" '
        'value="{share:g}" inputmode="decimal"></label>'
        '<span title="The z-score that it would have alone: size times the root of the runs, '
        'over the noise">z {z}</span>'
        '<button class="cross" data-do="drop" data-index="{i}" data-key="drop-{i}" '
        'aria-label="Remove effect {number}">×</button></div>'
    ).format(
        what="size per SD" if key == "size" else f"{row['spread']} scale",
        key=key, i=index, value=row[key], share=round(row["share"], 6), z=z, number=index + 1,
    )  # fmt: skip


def _verdict_html(session: Session, looking: Looking) -> Markup:
    if session.reach is None:
        return Markup("<p>Type runs, candidates and actives first.</p>")
    current = {
        family: each for family, each in looking.outlooks.items() if looking.is_current(each)
    }
    pieces = gains_verdict(session.fdp, current, done=not looking.waiting)
    exact = str(not looking.waiting).lower()
    return Markup('<p data-exact="{}">{}</p>').format(
        exact, Markup("").join(map(_piece, pieces))
    )


def _piece(piece: Piece) -> Markup:
    if piece.kind == "words":
        return Markup("{}").format(piece.text)
    if piece.kind == "target":
        return Markup('<span class="target">{}</span>').format(piece.text)
    return Markup('<span class="family {}">{}</span>').format(STROKE_OF[piece.kind], piece.text)


def _table(session: Session, looking: Looking) -> Markup:
    groups = Markup("").join(
        Markup('<th colspan="3" class="words">{}</th>').format(words)
        for words in RULES.values()
    )
    heads = Markup("<th>TPP</th><th>list</th><th>false</th>") * len(RULES)
    outlooks = looking.outlooks
    best = best_of({k: each for k, each in outlooks.items() if looking.is_current(each)})
    rows = Markup("").join(_row(family, looking, best) for family in COMPARED)
    notes = Markup("").join(
        Markup("<li>{}, {}: {}</li>").format(family, RULES[rule], point.reason)
        for family, each in outlooks.items()
        if looking.is_current(each)
        for rule, point in each.points.items()
        if point.reason
    )
    return Markup(
        "<table><caption>At FDP {} <small>counts are expected; one study strays at least by "
        "binomial chance</small></caption><thead><tr><th></th>{}</tr><tr>"
        '<th class="words">penalty</th>{}</tr></thead><tbody>{}{}</tbody></table>'
        '<ul class="why">{}</ul>'
    ).format(typed(session.fdp), groups, heads, rows, _comparator_rows(looking), notes)


def _row(family: str, looking: Looking, best: tuple[str, str] | None) -> Markup:
    outlook = looking.outlooks.get(family)
    cells = Markup("")
    for rule in RULES:
        if outlook is None or not looking.is_current(outlook):
            cells += Markup('<td class="soon">…</td><td></td><td></td>')
        else:
            cells += _cells(outlook.points[rule], (family, rule) == best)
    known = None if outlook is None else outlook.points["two-stage"]
    return Markup(
        '<tr><td class="words"><i class="sample {}"></i>{}<small>{}</small></td>{}</tr>'
    ).format(STROKE_OF[family], _LABELS[family], "" if known is None else _stated(known), cells)


def _cells(point: Prediction, best: bool) -> Markup:
    if point.reason:
        return Markup('<td title="{}">none</td><td></td><td></td>').format(point.reason)
    spread = f"one study: ± {computed(point.tpp_sd, 2)} TPP at least"
    if not math.isnan(point.lam):
        spread += f"; λ {significant(point.lam)}"
    return Markup(
        '<td class="{}" title="{}"><b>{}</b><meter value="{}"></meter></td>'
        "<td>{}</td><td>{}</td>"
    ).format(
        "best" if best else "", spread, computed(point.tpp), f"{point.tpp:.4f}",
        count(point.list_size), count(point.false_entries),
    )  # fmt: skip


def _stated(point: Prediction) -> str:
    """The parameters that tuning chose for the fit that is cut."""
    if point.levels is not None and point.share is not None:
        larger, smaller = point.levels
        return f"{100.0 * point.share:.3g} %, {larger:.2f} : {smaller:.2f}"
    return "" if point.ramp_level is None else f"q {point.ramp_level:.2f}"


def _comparator_rows(looking: Looking) -> Markup:
    answer = looking.comparators
    if answer is None or not looking.is_current(answer):
        return Markup("")
    least = answer.least_error
    told = "none" if least.reason else f"TPP {computed(least.tpp)}, FDP {computed(least.fdp)}"
    return Markup(
        '<tr class="known"><td class="words">screening one by one</td><td colspan="3"></td>{}'
        '<td colspan="3"></td></tr><tr class="known"><td class="words">lasso of least error'
        '</td><td colspan="3" class="words">{}</td><td colspan="6" class="words">what '
        "cross-validation aims at; its FDP is not chosen</td></tr>"
    ).format(_cells(answer.screening, False), told)
