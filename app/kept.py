"""The points a session has kept: what can be done with them, and taken back."""

import dataclasses
from functools import lru_cache
from typing import Any

import param

from app.upload import uploaded
from app.words import computed, typed
from engine.files import SHORTLIST_BYTES
from engine.limits.families import FAMILIES
from engine.shortlist import (
    MOST_POINTS,
    NAME_LENGTH,
    NOTE_LENGTH,
    Point,
    dump_shortlist,
    keep,
    load_shortlist,
)
from engine.study import Study

__all__ = ["Kept", "Mark", "made", "marks", "point_letter"]


class Kept(param.Parameterized):
    """The shortlist of one window; its verbs say in `notice` what they did."""

    points = param.Parameter(default=())
    notice = param.String(doc="What the last verb did; empty when nothing is to be told.")

    def __init__(self, **params: Any) -> None:
        super().__init__(**params)
        self._before: tuple[Point, ...] | None = None  # the points before the last change

    def add(self, study: Study, penalty: str, tpp: float) -> None:
        """Keep the point of lowest FDP that a penalty has at a TPP."""
        if len(self.points) >= MOST_POINTS:
            self.notice = f"A shortlist holds at most {MOST_POINTS} points."
            return
        label = FAMILIES[penalty].label
        name = f"{label[0].upper()}{label[1:]} at TPP {typed(tpp)}"
        point = made(study, penalty, tpp).renamed(name, "")
        letter = point_letter(len(self.points))
        notice = (
            f"Kept as {letter}: {label}, TPP {typed(point.tpp)}, FDP {computed(point.fdp)}."
        )
        self._change((*self.points, point), notice)

    def remove(self, index: int) -> None:
        """Remove a point."""
        if self._has(index):
            rest = self.points[:index] + self.points[index + 1 :]
            self._change(rest, f"{self.points[index].name} removed.")

    def rename(self, index: int, name: str | None = None, note: str | None = None) -> None:
        """Give a point another name or note, cut to what a file holds."""
        if not self._has(index):
            return
        point = self.points[index]
        name = (point.name if name is None else name.strip())[:NAME_LENGTH]
        note = (point.note if note is None else note.strip())[:NOTE_LENGTH]
        if (name, note) != (point.name, point.note):
            points = list(self.points)
            points[index] = point.renamed(name, note)
            self._change(tuple(points), f"{point_letter(index)} renamed.")

    def move(self, index: int, by: int) -> None:
        """Move a point up (-1) or down (1) in the list."""
        if self._has(index) and self._has(index + by):
            points = list(self.points)
            points.insert(index + by, points.pop(index))
            letter = point_letter(index + by)
            self._change(tuple(points), f"{points[index + by].name} is now {letter}.")

    def undo(self) -> None:
        """Take the last change back."""
        if self._before is not None:
            self.param.update(points=self._before, notice="")
            self._before = None

    def read(self, upload: dict[str, Any]) -> None:
        """Add the points of the file that the browser read: all of them or none.

        Raises
        ------
        ValueError
            Says what is wrong with the file.
        """
        new = load_shortlist(uploaded(upload, SHORTLIST_BYTES, "shortlist file"))
        total = len(self.points) + len(new)
        if total > MOST_POINTS:
            raise ValueError(f"points must be at most {MOST_POINTS} in all, not {total}")
        added = [point for point in new if point not in self.points]
        same = len(new) - len(added)
        notice = f"{len(added)} added" + (f", {same} already there." if same else ".")
        self._change((*self.points, *added), notice)

    def exported(self) -> str:
        """Return the text of the shortlist's file."""
        return dump_shortlist(self.points)

    def _has(self, index: int) -> bool:
        return 0 <= index < len(self.points)

    def _change(self, points: tuple[Point, ...], notice: str) -> None:
        self._before = self.points
        self.param.update(points=points, notice=notice)


@lru_cache(maxsize=512)
def made(study: Study, penalty: str, tpp: float) -> Point:
    """Make a point without a name; a reload asks for the same ones again."""
    return keep(study, penalty, tpp)


@dataclasses.dataclass(frozen=True)
class Mark:
    """A kept point on the trade-off plane, with the target that it stands for.

    The target is the point itself where that reaches it: then no stem joins the two.
    """

    letter: str
    tpp: float
    fdp: float
    target_tpp: float
    target_fdp: float


def marks(points: tuple[Point, ...], ratios: tuple[float, float]) -> list[Mark]:
    """Return the marks of the points kept on a study with these ratios."""
    found = []
    for i, point in enumerate(points):
        if (point.study.sampling_ratio, point.study.sparsity) == ratios:
            target = point.study.target
            aimed = (point.tpp, point.fdp)
            if target is not None and (target.fdp < point.fdp or target.tpp > point.tpp):
                aimed = (target.tpp, target.fdp)
            found.append(Mark(point_letter(i), point.tpp, point.fdp, *aimed))
    return found


def point_letter(index: int) -> str:
    """Name the kept points A to Z, then A2, B2 and so on."""
    turn, place = divmod(index, 26)
    return chr(ord("A") + place) + (str(turn + 1) if turn else "")
