"""The state of a window as the query of its address: a link reopens the same view.

The study, the target, what is shown, and the kept points, which are made again from penalty and
TPP. Everything is checked as a file would be. The page that is open stands after the '#'.
"""

import json
from collections.abc import Mapping
from typing import Any
from urllib.parse import urlencode

from app.kept import made
from app.state import Problem, Session
from engine.limits.families import FAMILIES
from engine.quantities import TPP
from engine.shortlist import Point
from engine.study import STUDY_SCHEMA, Study, study_from
from engine.version import VERSION

__all__ = ["MOST_LINKED", "open_link", "query_of"]

# Points in a link are made again when it is opened, at some 0.1 seconds each.
MOST_LINKED = 24

# A link typed by hand may leave out what Reach does not need.
_ONE_SIZE = '[{"size": 0.2, "share": 1.0}]'

_COUNTS = ("runs", "candidates", "actives")


def query_of(session: Session) -> str:
    """Return the query that `open_link` reads."""
    parts: dict[str, str] = {}
    study = session.study()
    if study is not None:
        data = study.to_dict()
        parts = {name: str(data[name]) for name in _COUNTS}
        parts |= {"tpp": repr(session.tpp), "fdp": repr(session.fdp)}
        parts |= {"noise_sd": repr(study.noise_sd), "effects": _compact(data["effects"])}
        parts |= {"title": study.title} if study.title else {}
    parts |= {
        "shown": " ".join(session.shown),
        "hatched": session.hatched,
        "as": session.kept_as,
        "keeping": session.keeping,
        "candidates_keep": "counts" if session.keeps_counts else "ratios",
        "theme": session.theme,
    }
    points = [point for point in session.kept.points if _can_be_made(point)]
    if points and len(points) <= MOST_LINKED:
        parts["points"] = _compact([_entry(point, study) for point in points])
    return urlencode(parts)


def open_link(session: Session, parts: Mapping[str, str]) -> None:
    """Take the view that a query describes; what is wrong in it becomes the problem."""
    try:
        study = _study(parts) if "runs" in parts else None
        points = _points(parts["points"], study) if "points" in parts else ()
    except ValueError as error:
        session.problem = Problem("link", f"link: {error}")
        return
    for key in FAMILIES if "shown" in parts else ():
        session.show(key, key in parts["shown"].split())
    session.hatch(parts.get("hatched", ""))
    session.keep_as(parts.get("as", ""))
    session.when_out(parts.get("keeping", ""))
    session.keep_counts(parts.get("candidates_keep") != "ratios")
    if parts.get("theme") == "dark":
        session.turn_theme()
    session.kept.points = points
    if study is not None:
        session.open_study(study)


def _study(parts: Mapping[str, str]) -> Study:
    data: dict[str, Any] = {
        "schema": STUDY_SCHEMA,
        "title": parts.get("title", ""),
        **{name: _number(parts.get(name, "")) for name in _COUNTS},
        "noise_sd": _number(parts.get("noise_sd", "1")),
        "effects": _json(parts.get("effects", _ONE_SIZE), "effects"),
    }
    if "tpp" in parts or "fdp" in parts:
        data["target"] = {name: _number(parts.get(name, "")) for name in ("tpp", "fdp")}
    return study_from(data)


def _entry(point: Point, study: Study | None) -> dict[str, Any]:
    """A point as penalty, TPP, words, and what its study has that the session's has not."""
    entry: dict[str, Any] = {"as": point.penalty, "tpp": point.tpp, "name": point.name}
    if point.note:
        entry["note"] = point.note
    here = {} if study is None else study.to_dict()
    own = point.study.to_dict()
    differs = {key: value for key, value in own.items() if here.get(key) != value}
    if "target" in here and "target" not in own:
        differs["target"] = None
    return entry | ({"study": differs} if differs else {})


def _points(text: str, study: Study | None) -> tuple[Point, ...]:
    entries = _json(text, "points")
    if not isinstance(entries, list) or len(entries) > MOST_LINKED:
        raise ValueError(f"points must be a list of at most {MOST_LINKED}")
    return tuple(_point(entry, study) for entry in entries)


def _point(entry: Any, study: Study | None) -> Point:
    if not isinstance(entry, dict) or not isinstance(entry.get("study", {}), dict):
        raise ValueError("points must hold objects")
    own = ({} if study is None else study.to_dict()) | entry.get("study", {})
    if own.get("target", {}) is None:
        del own["target"]
    tpp = TPP.check(entry.get("tpp"), "points: tpp")
    point = made(study_from(own), str(entry.get("as")), tpp)
    return point.renamed(str(entry.get("name", "")), str(entry.get("note", "")))


def _can_be_made(point: Point) -> bool:
    """Whether this version would give the same point again."""
    return point.data["version"] == VERSION


def _compact(data: Any) -> str:
    return json.dumps(data, separators=(",", ":"))


def _json(text: str, what: str) -> Any:
    try:
        return json.loads(text)
    except (ValueError, RecursionError):
        raise ValueError(f"{what} must be JSON") from None


def _number(text: str) -> Any:
    """A number where the text is one; the study's own check names what is wrong otherwise."""
    try:
        value = json.loads(text)
    except ValueError:
        return text
    return value
