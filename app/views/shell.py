"""The page as a whole: one session, its views, and the frame around them."""

from functools import partial
from pathlib import Path
from typing import Any
from urllib.parse import quote

import panel as pn
from markupsafe import Markup

from app.afterwards import Afterwards
from app.coalesce import Coalescer
from app.components.sheet import Sheet
from app.evaluation import evaluator
from app.link import open_link, query_of
from app.looking import Looking
from app.outlook import COMPARED, comparators, outlook
from app.reach import exact
from app.ready import ready_atlas, ready_contours
from app.state import Session
from app.theme import css_variables
from app.views.answer import AnswerView
from app.views.reach import ReachView
from app.views.shortlist import ShortlistView
from app.views.signal import SignalView
from app.views.study import StudyRail
from engine.files import STUDY_BYTES
from engine.study import Study

__all__ = ["page"]

_HERE = Path(__file__).parent.parent

# The mark: a boundary, and the handle that rides on it.
_MARK = (
    '<svg xmlns="http://www.w3.org/2000/svg" width="24" height="24" viewBox="0 0 24 24" '
    'aria-hidden="true"><path d="M2 20 C9 19 10 8 22 4" fill="none" stroke="{ink}" '
    'stroke-width="2.6"/><circle cx="12" cy="11" r="4.4" fill="{core}" stroke="{ring}" '
    'stroke-width="2.2"/></svg>'
)


def page(study: Study | None) -> pn.Template:
    """Build the page of a new session, opened on `study`."""
    doc = pn.state.curdoc
    session = Session(evaluator(doc, exact), ready_atlas(), ready_contours())
    inbox = Coalescer(doc, session.propose)
    afterwards = Afterwards(doc)
    reach = ReachView(session, inbox, afterwards)
    reach.tradeoff.loupe.attach(doc)
    rail = StudyRail(session, inbox, afterwards)
    answer = AnswerView(session, afterwards)
    families = {family: evaluator(doc, partial(outlook, family)) for family in COMPARED}
    looking = Looking(session, families | {"comparators": evaluator(doc, comparators)})
    signal = SignalView(session, looking, inbox, afterwards, reach.tradeoff.curves)
    shortlist = ShortlistView(session)
    frame = _Frame(session)
    query = {name: values[-1].decode() for name, values in pn.state.session_args.items()}
    if study is not None:
        session.open_study(study)
    open_link(session, query)
    frame.follow()
    template = pn.Template((_HERE / "page.html").read_text())
    for name, root in {
        **frame.roots(), **rail.roots(), **reach.roots(), **answer.roots(),
        **signal.roots(), **shortlist.roots(),
    }.items():  # fmt: skip
        template.add_panel(name, root)
    for name, text in _variables(session).items():
        template.add_variable(name, text)
    return template


def _variables(session: Session) -> dict[str, str]:
    ink = _MARK.format(ink="var(--ink)", core="var(--accent)", ring="var(--ring)")
    icon = _MARK.format(ink="#4C5B66", core="#FFD12E", ring="#111C24")
    return {
        "theme": session.theme,
        "mark": ink,
        "mark_url": quote(icon),
        "css": css_variables() + (_HERE / "page.css").read_text(),
        "script": (_HERE / "page.js").read_text(),
    }


class _Frame:
    """The header: the study's title, opening another study, and the address as a link."""

    def __init__(self, session: Session) -> None:
        self._session = session
        self.title = Sheet("title", self._use)
        self.actions = Sheet("actions", self._use)
        session.param.watch(self._show, ["title", "theme"])
        session.param.watch(self._turn, ["theme"])
        self._show()

    def roots(self) -> dict[str, Any]:
        return {"title": self.title, "actions": self.actions}

    def follow(self) -> None:
        """Keep the address in step with the session, whenever the hand rests."""
        params = ["reach", "title", "shown", "hatched", "kept_as", "keeping", "keeps_counts",
                  "theme"]  # fmt: skip
        self._session.param.watch(self._show_address, params)
        self._session.kept.param.watch(self._show_address, ["points"])

    def _show_address(self, *_: Any) -> None:
        reach = self._session.reach
        if reach is None or reach.exact:
            self.actions.ask("address", query=query_of(self._session))

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        match data.get("do"):
            case "link":
                self.actions.ask("copy", query=query_of(session))
            case "title":
                session.rename_study(str(data.get("value", "")))
            case "open":
                session.open_file(data)
            case "theme":
                session.turn_theme()
            case "example":
                session.open_example()

    def _turn(self, *_: Any) -> None:
        self.actions.ask("theme", name=self._session.theme)

    def _show(self, *_: Any) -> None:
        session = self._session
        other = "Dark" if session.theme == "light" else "Light"
        self.title.html = Markup(
            '<input data-do="title" data-key="title" value="{}" maxlength="200" '
            'placeholder="Untitled study" aria-label="Title of the study">'
        ).format(session.title)
        self.actions.html = Markup(
            '<button class="button" data-do="example" data-key="example">Example</button>'
            '<label class="button">Open study<input class="visually-hidden" type="file" '
            'accept=".json,application/json" data-do="open" data-limit="{}" data-key="open">'
            '</label><button class="button" data-do="link" data-key="link">Copy link</button>'
            '<button class="button" data-do="theme" data-key="theme">{}</button>'
        ).format(STUDY_BYTES, other)
