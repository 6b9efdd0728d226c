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
from app.reach import exact

__all__ = ["Evaluate", "evaluator", "start_workers"]

# What is to be evaluated, and what receives the answer; both belong to the work.
Done = Callable[..., None]
Evaluate = Callable[[Any, Done], None]

# A pause of the hand: shorter ones would start work that the next move throws away.
REST_MS = 120

# Two: a long answer on one page does not hold up a short one on another.
_WORKERS = 2


def evaluator(doc: Document, work: Callable[..., tuple[Any, ...]]) -> Evaluate:
    """Return the function that a session asks for the answers of some work.

    It waits until what is asked has rested for `REST_MS`, runs the work in a worker with the
    request as its argument, and calls `done` with the answer on the session's own event loop.
    Before the page has loaded it only remembers the request (see `app.components.loading`).
    """
    requests = _Requests(doc, work)
    when_loaded(requests.open)
    return requests.take


class _Requests:
    """The requests of one session; the latest counts."""

    def __init__(self, doc: Document, work: Callable[..., tuple[Any, ...]]) -> None:
        self._doc = doc
        self._work = work
        self._loaded = False
        self._latest: tuple[Any, Done] | None = None

    def open(self) -> None:
        """Start what was asked for while the page was loading."""
        self._loaded = True
        if self._latest is not None:
            self._start(self._latest)

    def take(self, target: Any, done: Done) -> None:
        """Evaluate `target` when it has rested."""
        request = self._latest = (target, done)
        if self._loaded:
            self._doc.add_timeout_callback(partial(self._start, request), REST_MS)

    def _start(self, request: tuple[Any, Done], tries: int = 2) -> None:
        if request is self._latest and tries:
            finish = partial(self._finish, request, tries - 1)
            submit(self._work, request[0]).add_done_callback(finish)

    def _finish(self, request: tuple[Any, Done], tries: int, future: Future[Any]) -> None:
        """Runs in a thread of the pool: only hands over to the session's event loop."""
        if future.cancelled():
            return
        if isinstance(future.exception(), BrokenExecutor):  # the worker was killed
            self._doc.add_next_tick_callback(partial(self._start, request, tries))
            return
        self._doc.add_next_tick_callback(partial(self._hand_over, request, *future.result()))

    def _hand_over(self, request: tuple[Any, Done], *answer: Any) -> None:
        if request is self._latest:
            with hold(self._doc):
                request[1](*answer)


@lru_cache(maxsize=1)
def start_workers() -> ProcessPoolExecutor:
    """Start the worker processes, which import the engine and `app.reach` but no pictures."""
    pool = ProcessPoolExecutor(_WORKERS, mp_context=multiprocessing.get_context("spawn"))
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
