"""The planes first: what may follow them leaves in a message of its own.

A component of HTML costs the server half a millisecond, a figure's source a tenth of that, and
words have to be laid out; every picture takes its time to paint. So words and small pictures
wait until the planes have left, and while the hand moves they follow some fifteen times a
second.
"""

import math
import time
from collections.abc import Callable
from typing import Any

from bokeh.document import Document
from panel.io import hold

__all__ = ["Afterwards"]


EVERY_MS = 60


class Afterwards:
    """Runs what was left for later, each thing once, at most once in `EVERY_MS`.

    Parameters
    ----------
    doc : bokeh Document
        The session's document; its event loop runs the rest.
    """

    def __init__(self, doc: Document) -> None:
        self._doc = doc
        self._waiting: dict[Callable[[], None], None] = {}
        self._last = -math.inf

    def put_off(self, show: Callable[[], None]) -> Callable[..., None]:
        """Return a watcher that runs `show` soon, once for all its events."""

        def watcher(*_: Any) -> None:
            waiting = bool(self._waiting)
            self._waiting[show] = None
            if not waiting:
                since = 1e3 * (time.monotonic() - self._last)
                self._doc.add_timeout_callback(self._run, int(max(EVERY_MS - since, 1.0)))

        return watcher

    def _run(self) -> None:
        waiting, self._waiting = self._waiting, {}
        self._last = time.monotonic()
        with hold(self._doc):
            for show in waiting:
                show()
