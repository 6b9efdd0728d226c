"""Exact curves, evaluated off the event loop in processes that all sessions share.

The searched boundaries take a fraction of a second: long enough to make every slider of every
window wait, so a worker process evaluates them. A request that is no longer the latest of its
session is dropped before it starts.
"""

import atexit
import multiprocessing
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from functools import lru_cache

from bokeh.document import Document

from app.reach import Curves, exact_curves

__all__ = ["Evaluate", "evaluator", "start_workers"]

Done = Callable[[Curves], None]
Evaluate = Callable[[float, float, Done], None]

# A pause of the hand: shorter ones would start work that the next move throws away.
REST_MS = 120


def evaluator(doc: Document) -> Evaluate:
    """Return the function that a session asks for exact curves.

    It waits until the study has rested for `REST_MS`, evaluates in a worker, and calls `done`
    on the session's own event loop.
    """
    latest: list[object] = [None]

    def evaluate(sampling_ratio: float, sparsity: float, done: Done) -> None:
        ticket = latest[0] = object()

        def start() -> None:
            if latest[0] is ticket:
                submit(exact_curves, sampling_ratio, sparsity).add_done_callback(finish)

        def finish(future: Future[Curves]) -> None:
            if future.exception() is None and latest[0] is ticket:
                doc.add_next_tick_callback(lambda: done(future.result()))

        doc.add_timeout_callback(start, REST_MS)

    return evaluate


@lru_cache(maxsize=1)
def start_workers() -> ProcessPoolExecutor:
    """Start the worker process; it imports the engine only."""
    pool = ProcessPoolExecutor(1, mp_context=multiprocessing.get_context("spawn"))
    atexit.register(pool.shutdown, cancel_futures=True)
    return pool


def submit(function: Callable[..., Curves], *args: float) -> Future[Curves]:
    """Submit to the worker; a pool whose worker was killed is replaced once."""
    try:
        return start_workers().submit(function, *args)
    except BrokenExecutor:
        start_workers.cache_clear()
        return start_workers().submit(function, *args)
