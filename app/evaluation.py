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

from app.reach import Curves, Reach, Target, exact

__all__ = ["Evaluate", "evaluator", "start_workers"]

Done = Callable[[Reach, Curves], None]
Evaluate = Callable[[Target, Done], None]

# A pause of the hand: shorter ones would start work that the next move throws away.
REST_MS = 120


def evaluator(doc: Document) -> Evaluate:
    """Return the function that a session asks for exact values.

    It waits until the study and its target have rested for `REST_MS`, evaluates in a worker,
    and calls `done` on the session's own event loop.
    """
    latest: list[object] = [None]

    def evaluate(target: Target, done: Done) -> None:
        ticket = latest[0] = object()

        def start() -> None:
            if latest[0] is ticket:
                submit(exact, target).add_done_callback(finish)

        def finish(future: Future[tuple[Reach, Curves]]) -> None:
            if not future.cancelled() and future.exception() is None:
                doc.add_next_tick_callback(partial(hand_over, *future.result()))

        def hand_over(reach: Reach, curves: Curves) -> None:
            if latest[0] is ticket:
                done(reach, curves)

        doc.add_timeout_callback(start, REST_MS)

    return evaluate


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
