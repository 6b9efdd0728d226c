"""Exact values, evaluated off the event loop in processes that all sessions share.

The searched boundaries take a fraction of a second: long enough to make every slider of every
window wait, so a worker process evaluates them. A request that is no longer the latest of its
session is dropped before it starts.
"""

import atexit
import multiprocessing
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from functools import lru_cache, partial
from typing import Any

from bokeh.document import Document
from panel.io import hold

from app.components.loading import when_loaded
from app.reach import Curves, Reach, Target, exact

__all__ = ["Evaluate", "evaluator", "start_workers"]

Done = Callable[[Reach, Curves], None]
Evaluate = Callable[[Target, Done], None]

# A pause of the hand: shorter ones would start work that the next move throws away.
REST_MS = 120


def evaluator(doc: Document) -> Evaluate:
    """Return the function that a session asks for exact values.

    It waits until the study and its target have rested for `REST_MS`, evaluates in a worker,
    and calls `done` on the session's own event loop. Before the page has loaded it only
    remembers the request (see `app.components.loading`).
    """
    requests = _Requests(doc)
    when_loaded(requests.open)
    return requests.take


class _Requests:
    """The requests of one session; the latest counts."""

    def __init__(self, doc: Document) -> None:
        self._doc = doc
        self._loaded = False
        self._latest: tuple[Target, Done] | None = None

    def open(self) -> None:
        """Start what was asked for while the page was loading."""
        self._loaded = True
        if self._latest is not None:
            self._start(self._latest)

    def take(self, target: Target, done: Done) -> None:
        """Evaluate `target` when it has rested."""
        request = self._latest = (target, done)
        if self._loaded:
            self._doc.add_timeout_callback(partial(self._start, request), REST_MS)

    def _start(self, request: tuple[Target, Done], tries: int = 2) -> None:
        if request is self._latest and tries:
            finish = partial(self._finish, request, tries - 1)
            submit(exact, request[0]).add_done_callback(finish)

    def _finish(self, request: tuple[Target, Done], tries: int, future: Future[Any]) -> None:
        """Runs in a thread of the pool: only hands over to the session's event loop."""
        if future.cancelled():
            return
        if isinstance(future.exception(), BrokenExecutor):  # the worker was killed
            self._doc.add_next_tick_callback(partial(self._start, request, tries))
            return
        self._doc.add_next_tick_callback(partial(self._hand_over, request, *future.result()))

    def _hand_over(self, request: tuple[Target, Done], reach: Reach, curves: Curves) -> None:
        if request is self._latest:
            with hold(self._doc):
                request[1](reach, curves)


@lru_cache(maxsize=1)
def start_workers() -> ProcessPoolExecutor:
    """Start the worker process, which imports `app.reach` and the engine but no pictures."""
    pool = ProcessPoolExecutor(1, mp_context=multiprocessing.get_context("spawn"))
    pool.submit(exact, (30, 100, 20, 0.5, 0.5))  # the first answer pays for the imports
    atexit.register(pool.shutdown, cancel_futures=True)
    return pool


def submit(function: Callable[..., Any], *args: Any) -> Future[Any]:
    """Submit to the worker; a pool whose worker was killed is replaced once."""
    try:
        return start_workers().submit(function, *args)
    except BrokenExecutor:
        start_workers.cache_clear()
        return start_workers().submit(function, *args)
