"""Many independent pieces of work on worker processes, or on any executor.

Results are taken as they come. A worker that is killed costs the pieces it held, which are done
again; a stop keeps what is done.
"""

import os
import threading
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import (
    FIRST_COMPLETED,
    BrokenExecutor,
    Executor,
    Future,
    ProcessPoolExecutor,
    wait,
)
from contextlib import contextmanager
from dataclasses import dataclass
from multiprocessing.context import SpawnContext, SpawnProcess
from typing import Any, TypeVar

__all__ = ["Ending", "LocalPool", "default_workers", "gather"]

Result = TypeVar("Result")

# How often a stop is looked for, in seconds.
_LOOK = 0.1
# Losses with nothing finished in between, after which there is no point in going on.
_MOST_LOSSES = 3

# Two threads of linear algebra in one process can be many times slower than one on a busy
# machine; workers use the cores better. Read when numpy is first imported, so set before.
_ONE_THREAD = {
    "OMP_NUM_THREADS": "1",
    "OPENBLAS_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
    "VECLIB_MAXIMUM_THREADS": "1",
}


@dataclass(frozen=True)
class Ending:
    """How the work ended.

    Attributes
    ----------
    reason : str
        Why pieces were left undone; empty where none was.
    losses : int
        How often workers were lost and their pieces done again.
    """

    reason: str
    losses: int


def default_workers() -> int:
    """Return the number of cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


class LocalPool:
    """Fresh worker processes with one thread of linear algebra each."""

    def __init__(self, workers: int) -> None:
        self._workers = workers
        self._context = _Context()
        self.executor = self._open()

    def reopen(self) -> None:
        """Start again after workers were lost."""
        self.close()
        self.executor = self._open()

    def close(self) -> None:
        """End the workers, whatever they are at."""
        self.executor.shutdown(wait=False, cancel_futures=True)
        for process in self._context.started:
            process.terminate()
        self.executor.shutdown(wait=True)
        self._context.started.clear()

    def _open(self) -> Executor:
        return ProcessPoolExecutor(self._workers, mp_context=self._context)


def gather(
    work: Callable[[int], Result],
    pieces: list[int],
    take: Callable[[Result], None],
    *,
    workers: int,
    executor: Executor | None = None,
    stopped: Callable[[], bool] = lambda: False,
) -> Ending:
    """Do `work` on each piece and hand every result to `take`, as they come.

    Parameters
    ----------
    work : callable
        Can be pickled; called in a worker.
    pieces : list of int
        What it is called with.
    take : callable
        Called here, in the thread of the caller.
    workers : int
        Processes to start; with an executor, twice as many pieces are with it at a time.
    executor : concurrent.futures.Executor, optional
        Instead of worker processes of this machine. It is left open.
    stopped : callable
        Asked several times a second whether to stop.

    Returns
    -------
    Ending
        Why pieces were left undone, if any were.

    Examples
    --------
    >>> from concurrent.futures import ThreadPoolExecutor
    >>> from engine.workers import gather
    >>> squares = []
    >>> with ThreadPoolExecutor(2) as executor:
    ...     gather(lambda i: i * i, [1, 2, 3], squares.append, workers=2, executor=executor)
    Ending(reason='', losses=0)
    >>> sorted(squares)
    [1, 4, 9]
    """
    pool = LocalPool(workers) if executor is None else None
    run = _Run(work, deque(pieces), pool, executor, 2 * workers)
    try:
        while run.unfinished and not run.reason:
            if stopped():
                run.reason = "stopped"
            else:
                for result in run.step():
                    take(result)
    finally:
        run.drop()
        if pool is not None:
            pool.close()
    return Ending(run.reason, run.losses)


class _Run:
    """Pieces that wait, and pieces that are with the executor."""

    def __init__(
        self,
        work: Callable[[int], Any],
        waiting: deque[int],
        pool: LocalPool | None,
        executor: Executor | None,
        most: int,
    ) -> None:
        self._work = work
        self._waiting = waiting
        self._pool = pool
        self._executor = executor
        self._most = most
        self._running: dict[Future[Any], int] = {}
        self._in_a_row = 0
        self.losses = 0
        self.reason = ""

    @property
    def unfinished(self) -> bool:
        return bool(self._waiting or self._running)

    def drop(self) -> None:
        """Ask for nothing more."""
        for future in self._running:
            future.cancel()

    def step(self) -> list[Any]:
        """Hand pieces out, wait a moment, and return the results that have come."""
        broken = not self._hand_out()
        done, _ = wait(self._running, timeout=_LOOK, return_when=FIRST_COMPLETED)
        results = []
        for future in done:
            piece = self._running.pop(future)
            error = GivenUpError() if future.cancelled() else future.exception()
            if error is None:
                results.append(future.result())
                continue
            self._waiting.append(piece)
            if isinstance(error, BrokenExecutor):
                broken = True
            else:
                self._count_loss(f"replicate {piece} failed: {_told(error)}")
        if results:
            self._in_a_row = 0
        if broken:
            self._replace_workers()
        return results

    def _hand_out(self) -> bool:
        executor = self._executor if self._pool is None else self._pool.executor
        while self._waiting and len(self._running) < self._most and executor is not None:
            try:
                future = executor.submit(self._work, self._waiting[0])
            except RuntimeError:  # broken, or shut down by someone else
                return False
            self._running[future] = self._waiting.popleft()
        return True

    def _replace_workers(self) -> None:
        """The pieces of a broken pool wait again; what had finished by then is still taken."""
        self._count_loss("workers were lost")
        for future in [f for f in self._running if not _finished(f)]:
            self._waiting.append(self._running.pop(future))
        if self._pool is None:
            self.reason = self.reason or "the executor broke"
        elif not self.reason:
            self._pool.reopen()

    def _count_loss(self, what: str) -> None:
        self.losses += 1
        self._in_a_row += 1
        if self._in_a_row >= _MOST_LOSSES:
            self.reason = f"{what}, {_MOST_LOSSES} times in a row"


class GivenUpError(Exception):
    """A piece that the executor gave up."""


def _finished(future: Future[Any]) -> bool:
    return future.done() and not future.cancelled() and future.exception() is None


def _told(error: BaseException) -> str:
    return f"{type(error).__name__}: {error}".rstrip(": ")


class _OneThreadProcess(SpawnProcess):
    """A fresh process in whose environment linear algebra has one thread."""

    def start(self) -> None:
        with _environment(_ONE_THREAD):
            super().start()


class _Context(SpawnContext):
    """Starts such processes and remembers them."""

    def __init__(self) -> None:
        super().__init__()
        self.started: list[_OneThreadProcess] = []

    def Process(  # type: ignore[override] # noqa: N802, the name ProcessPoolExecutor calls
        self, *args: Any, **kwargs: Any
    ) -> _OneThreadProcess:
        process = _OneThreadProcess(*args, **kwargs)
        self.started.append(process)
        return process


_ENVIRONMENT_LOCK = threading.Lock()


@contextmanager
def _environment(values: dict[str, str]) -> Iterator[None]:
    with _ENVIRONMENT_LOCK:
        before = {name: os.environ.get(name) for name in values}
        os.environ.update(values)
        try:
            yield
        finally:
            for name, value in before.items():
                if value is None:
                    del os.environ[name]
                else:
                    os.environ[name] = value
