"""The Shortlist: a strip of kept points under the planes, and a page with their table."""

from typing import Any

from markupsafe import Markup

from app.components.sheet import Sheet
from app.state import Session
from app.words import computed, count, ratio, typed
from engine.files import SHORTLIST_BYTES
from engine.limits.families import FAMILIES
from engine.shortlist import Point

__all__ = ["ShortlistView"]


class ShortlistView:
    """Strip and table of one session's kept points."""

    def __init__(self, session: Session) -> None:
        self._session = session
        self.strip = Sheet("strip", self._use)
        self.table = Sheet("table", self._use)
        session.param.watch(self._show, ["points"])
        self._show()

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        match data.get("do"):
            case "remove":
                session.remove(int(data["index"]))
            case "export":
                self.strip.save("shortlist.json", session.exported())
            case "import":
                session.import_points(data)

    def _show(self, *_: Any) -> None:
        points = self._session.points
        files = _files(bool(points))
        chips = Markup("").join(_chip(i, point) for i, point in enumerate(points))
        empty = Markup('<span class="empty">Points you keep stand here.</span>')
        self.strip.html = Markup('<h2>Shortlist</h2><div class="chips">{}</div>{}').format(
            chips or empty, files
        )
        self.table.html = _table(points, files)


def letter(index: int) -> str:
    """Name the kept points A to Z, then A2, B2 and so on."""
    turn, place = divmod(index, 26)
    return chr(ord("A") + place) + (str(turn + 1) if turn else "")


def _chip(index: int, point: Point) -> Markup:
    return Markup(
        '<div class="chip"><span class="letter">{letter}</span><span><b>{name}</b>'
        "<small>{family}, TPP {tpp}, FDP {fdp}</small></span>"
        '<button class="cross" data-do="remove" data-index="{index}" data-key="remove-{index}" '
        'aria-label="Remove {letter}">×</button></div>'
    ).format(
        letter=letter(index),
        name=point.name,
        family=FAMILIES[point.penalty].label,
        tpp=typed(point.tpp),
        fdp=computed(point.fdp),
        index=index,
    )


def _files(some: bool) -> Markup:
    return Markup(
        '<label class="button">Import<input class="visually-hidden" type="file" '
        'accept=".json,application/json" data-do="import" data-limit="{}" data-key="import">'
        '</label><button class="button" data-do="export" data-key="export" {}>Export JSON</button>'
    ).format(SHORTLIST_BYTES, "" if some else Markup("disabled"))


_COLUMNS = (
    ("", "words"), ("Name", "words"), ("Penalty", "words"), ("Runs", ""), ("Candidates", ""),
    ("Actives", ""), ("Sampling ratio", ""), ("Sparsity", ""), ("TPP", ""), ("FDP", ""),
    ("Lasso", ""), ("Closed form", ""), ("Two-level", ""), ("Sorted L1", ""),
    ("Power limit", ""), ("Zero threshold, τ", ""), ("", ""),
)  # fmt: skip


def _table(points: tuple[Point, ...], files: Markup) -> Markup:
    if not points:
        return Markup(
            '<p class="empty">No points yet. On Reach, set a target and press Keep this point; '
            "or import a file.</p><p>{}</p>"
        ).format(files)
    heads = Markup("").join(
        Markup('<th class="{}" scope="col">{}</th>').format(kind, name)
        for name, kind in _COLUMNS
    )
    rows = Markup("").join(_row(i, point) for i, point in enumerate(points))
    return Markup(
        "<table><caption>Kept operating points</caption><thead><tr>{}</tr></thead>"
        "<tbody>{}</tbody></table><p>{}</p>"
    ).format(heads, rows, files)


def _row(index: int, point: Point) -> Markup:
    study, limits = point.study, point.limits
    numbers = [
        count(study.runs),
        count(study.candidates),
        count(study.actives),
        ratio(study.sampling_ratio),
        ratio(study.sparsity),
        typed(point.tpp),
        computed(point.fdp),
        *(computed(limits[key]) for key in limits_shown()),
    ]
    return Markup("<tr>{}</tr>").format(numbers)
