"""The Shortlist: a strip of kept points under the planes, and a page with their table."""

from typing import Any

from markupsafe import Markup

from app.components.sheet import Sheet
from app.kept import point_letter
from app.state import Session
from app.words import computed, count, ratio, significant, typed
from engine.files import SHORTLIST_BYTES
from engine.limits.families import FAMILIES
from engine.shortlist import LIMIT_KEYS, NAME_LENGTH, Point

__all__ = ["ShortlistView"]


class ShortlistView:
    """Strip and table of one session's kept points."""

    def __init__(self, session: Session) -> None:
        self._session = session
        self.strip = Sheet("strip", self._use)
        self.table = Sheet("table", self._use)
        session.kept.param.watch(self._show, ["points", "notice"])
        self._show()

    def roots(self) -> dict[str, Any]:
        """Everything the page places, by name."""
        return {"strip": self.strip, "table": self.table}

    def _use(self, data: dict[str, Any]) -> None:
        session = self._session
        match data.get("do"):
            case "open":
                session.open_point(int(data["index"]))
            case "name":
                session.kept.rename(int(data["index"]), name=str(data["value"]))
            case "note":
                session.kept.rename(int(data["index"]), note=str(data["value"]))
            case "up":
                session.kept.move(int(data["index"]), -1)
            case "down":
                session.kept.move(int(data["index"]), 1)
            case "remove":
                session.kept.remove(int(data["index"]))
            case "undo":
                session.kept.undo()
            case "export":
                self.strip.ask("save", name="shortlist.json", text=session.kept.exported())
            case "import":
                session.import_points(data)

    def _show(self, *_: Any) -> None:
        kept = self._session.kept
        points, files = kept.points, _files(bool(kept.points))
        chips = Markup("").join(_chip(i, point) for i, point in enumerate(points))
        empty = Markup('<span class="empty">Points you keep stand here.</span>')
        told = _notice(kept.notice, "undo")
        self.strip.html = Markup('<h2>Shortlist</h2><div class="chips">{}</div>{}{}').format(
            chips or empty, told, files
        )
        self.table.html = _table(points, files, kept.notice)
        self.strip.ask("count", kept=len(points))


def _chip(index: int, point: Point) -> Markup:
    return Markup(
        '<div class="chip"><button class="opens" data-do="open" data-index="{index}" '
        'data-key="open-{index}" title="Bring its study and target back">'
        '<span class="letter">{letter}</span><span><b>{name}</b>'
        "<small>{family}, TPP {tpp}, FDP {fdp}</small></span></button>"
        '<button class="cross" data-do="remove" data-index="{index}" data-key="remove-{index}" '
        'aria-label="Remove {letter}">×</button></div>'
    ).format(
        letter=point_letter(index),
        name=point.name,
        family=FAMILIES[point.penalty].label,
        tpp=typed(point.tpp),
        fdp=computed(point.fdp),
        index=index,
    )


def _notice(text: str, key: str) -> Markup:
    if not text:
        return Markup("")
    return Markup(
        '<p class="notice" role="status">{} <button data-do="undo" data-key="{}">Undo</button>'
        "</p>"
    ).format(text, key)


def _files(some: bool) -> Markup:
    return Markup(
        '<label class="button">Import<input class="visually-hidden" type="file" '
        'accept=".json,application/json" data-do="import" data-limit="{}" data-key="import">'
        '</label><button class="button" data-do="export" data-key="export" {}>'
        "Export JSON</button>"
    ).format(SHORTLIST_BYTES, "" if some else Markup("disabled"))


_COLUMNS = (
    ("", "words"), ("Name and study", "words"), ("Runs", ""), ("Candidates", ""),
    ("Actives", ""), ("Ratio", ""), ("Sparsity", ""), ("Penalty", "words"), ("TPP", ""),
    ("FDP", ""), ("lasso", ""), ("closed form", ""), ("two-level", ""), ("sorted L1", ""),
    ("Power limit", ""), ("Zero threshold", ""), ("Attained", "words"),
)  # fmt: skip


def _table(points: tuple[Point, ...], files: Markup, notice: str) -> Markup:
    if not points:
        return Markup(
            '<p class="empty">No points yet. On Reach, set a target and press Keep this point; '
            'or import a file.</p><p class="files">{}</p>'
        ).format(files)
    heads = Markup("").join(
        Markup('<th class="{}" scope="col">{}</th>').format(kind, name)
        for name, kind in _COLUMNS
    )
    rows = Markup("").join(_row(i, point) for i, point in enumerate(points))
    return Markup(
        "<table><caption>Kept operating points <small>FDP: the lowest at that TPP for the "
        "penalty kept; then that of every penalty; zero threshold in units of τ</small>"
        "</caption>"
        '<thead><tr>{}</tr></thead><tbody>{}</tbody></table>{}<p class="files">{}</p>'
    ).format(heads, rows, _notice(notice, "undo-table"), files)


def _row(index: int, point: Point) -> Markup:
    study, penalty, facts = point.study, point.penalty, point.data["witness"]
    numbers = [count(study.runs), count(study.candidates), count(study.actives)]
    numbers += [ratio(study.sampling_ratio), ratio(study.sparsity)]
    limits = [computed(point.limit(key)) for key in (*LIMIT_KEYS, "power_limit")]
    return Markup(
        '<tr><td class="words tools"><button class="opens" data-do="open" data-index="{index}" '
        'data-key="open-row-{index}" title="Bring its study and target back">'
        '<span class="letter">{letter}</span></button>{tools}</td>'
        '<td class="words name"><input data-do="name" data-index="{index}" '
        'data-key="name-{index}" value="{name}" maxlength="{longest}" aria-label="Name of '
        '{letter}"><small>{title}</small><input class="note" data-do="note" '
        'data-index="{index}" data-key="note-{index}" value="{note}" placeholder="Note" '
        'aria-label="Note on {letter}"></td>{numbers}'
        '<td class="words"><i class="sample {key}"></i>{label}</td><td>{tpp}</td>'
        "<td><b>{fdp}</b></td>{limits}<td>{threshold}</td>"
        '<td class="words why">{attained}</td></tr>'
    ).format(
        letter=point_letter(index),
        tools=_tools(index),
        name=point.name,
        note=point.note,
        longest=NAME_LENGTH,
        title=study.title,
        numbers=_cells(numbers),
        key=penalty,
        label=FAMILIES[penalty].label,
        tpp=typed(point.tpp),
        fdp=computed(point.fdp),
        limits=_cells(limits),
        threshold=significant(point.data["strength"]["zero_threshold"]),
        attained="yes" if facts["attained"] else f"approached: {facts['reason']}",
        index=index,
    )


def _tools(index: int) -> Markup:
    letter = point_letter(index)
    return Markup("").join(
        Markup(
            '<button class="cross" data-do="{do}" data-index="{index}" '
            'data-key="{do}-row-{index}" aria-label="{words} {letter}">{sign}</button>'
        ).format(do=do, index=index, words=words, letter=letter, sign=sign)
        for do, words, sign in (
            ("up", "Move up", "↑"), ("down", "Move down", "↓"), ("remove", "Remove", "×"),
        )
    )  # fmt: skip


def _cells(texts: list[str]) -> Markup:
    return Markup("").join(Markup("<td>{}</td>").format(text) for text in texts)
