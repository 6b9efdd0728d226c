"""Latest wins: many changes from the browser, one answer.

A slider that is held down sends a value every few milliseconds. Answering each would leave
the picture seconds behind the hand, so the values of about 10 ms are gathered, the last one
of each field is kept, and they are applied together.
"""

from collections.abc import Callable
from typing import Any

from bokeh.document import Document
from panel.io import hold

__all__ = ["Coalescer"]

WINDOW_MS = 10


class Coalescer:
    """Gather values by field and hand them over at most once every `WINDOW_MS`.

    Parameters
    ----------
    doc : bokeh Document
        The session's document; its event loop runs the hand-over.
    apply : callable
        Receives a dict of the latest value of each field.
    """

    def __init__(self, doc: Document, apply: Callable[[dict[str, Any]], None]) -> None:
        self._doc = doc
        self._apply = apply
        self._pending: dict[str, Any] = {}

    def post(self, field: str, value: Any) -> None:
        """Keep `value` as the latest of `field`."""
        waiting = bool(self._pending)
        self._pending[field] = value
        if not waiting:
            self._doc.add_timeout_callback(self._flush, WINDOW_MS)

    def _flush(self) -> None:
        pending, self._pending = self._pending, {}
        with hold(self._doc):  # the whole answer in one message
            self._apply(pending)
