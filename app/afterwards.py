"""Pictures first: what may follow them leaves in a message of its own.

A component of HTML costs the server half a millisecond, a figure's source a tenth of that. So
views let their words wait until the pictures have left; the eye gets both in the same frame or
the next one.
"""

from collections.abc import Callable
from typing import Any

from bokeh.document import Document
from panel.io import hold

__all__ = ["Afterwards"]


class Afterwards:
    """Runs what was left for later, each thing once, on the document's next turn.

    Parameters
    ----------
    doc : bokeh Document
        The session's document; its event loop runs the rest.
    """

    def __init__(self, doc: Document) -> None:
        self._doc = doc
        self._waiting: dict[Callable[[], None], None] = {}

    def put_off(self, show: Callable[[], None]) -> Callable[..., None]:
        """Return a watcher that runs `show` on the next turn, once for all its events."""

        def watcher(*_: Any) -> None:
            waiting = bool(self._waiting)
            self._waiting[show] = None
            if not waiting:
                self._doc.add_next_tick_callback(self._run)

        return watcher

    def _run(self) -> None:
        waiting, self._waiting = self._waiting, {}
        with hold(self._doc):
            for show in waiting:
                show()
