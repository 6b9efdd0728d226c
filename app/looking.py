"""What the Signal page has been told so far: the outlook of each family, as answers come in."""

from functools import partial
from typing import Any

import param

from app.evaluation import Evaluate
from app.outlook import Comparators, Outlook
from app.state import Session
from engine.study import Study

__all__ = ["Looking"]


class Looking(param.Parameterized):
    """The answers for one session's study, asked for only while the Signal page is open.

    Parameters
    ----------
    session : Session
        Whose study and FDP are looked at.
    evaluate : dict of str to callable
        What to ask by family, and under 'comparators'; called with ((study, fdp), done).
    """

    outlooks = param.Dict(default={}, doc="By family; some may be of an earlier study.")
    comparators = param.Parameter(default=None)
    opened = param.Boolean(default=False)

    def __init__(self, session: Session, evaluate: dict[str, Evaluate]) -> None:
        super().__init__()
        self._session, self._evaluate = session, evaluate
        self._asked: tuple[Study, float] | None = None
        session.param.watch(self._ask, ["accepted"])

    def open(self, opened: bool) -> None:
        """Open or close the page."""
        self.opened = opened
        self._ask()

    @property
    def waiting(self) -> bool:
        """Whether an answer for the study as it stands is still to come."""
        answers = [*self.outlooks.values(), self.comparators]
        current = [each for each in answers if each is not None and self.is_current(each)]
        return self._asked is not None and len(current) < len(self._evaluate)

    def is_current(self, answer: Outlook | Comparators) -> bool:
        """Whether an answer is for the study and the FDP as they stand."""
        return (answer.study, answer.fdp) == self._asked

    def _ask(self, *_: Any) -> None:
        study = self._session.study()
        if not self.opened or study is None or (study, self._session.fdp) == self._asked:
            return
        asked = self._asked = (study, self._session.fdp)
        for key, evaluate in self._evaluate.items():
            evaluate(asked, partial(self._take, key))
        self.param.trigger("outlooks")

    def _take(self, key: str, answer: Any) -> None:
        if key == "comparators":
            self.comparators = answer
        else:
            self.outlooks = {**self.outlooks, key: answer}
