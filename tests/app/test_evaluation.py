"""Exact values from a worker: rested, latest only, and in spite of a killed worker."""

import contextlib
import os
import signal
from concurrent.futures import BrokenExecutor

import pytest

from app.evaluation import _Requests, start_workers, submit

TARGET = (60, 200, 40, 0.8, 0.75)


class Loop:
    """Stands for a document: runs callbacks when told to."""

    def __init__(self):
        self.waiting = []

    def add_timeout_callback(self, callback, milliseconds):
        self.waiting.append(callback)

    def add_next_tick_callback(self, callback):
        self.waiting.append(callback)

    def run(self):
        waiting, self.waiting = self.waiting, []
        for callback in waiting:
            callback()


@pytest.fixture
def pool():
    """Give each test a worker of its own, and every job time to end."""
    start_workers.cache_clear()
    yield
    start_workers().shutdown()
    start_workers.cache_clear()


def finish(loop):
    """Run the loop until the worker has nothing more to say."""
    for _ in range(6):
        loop.run()
        with contextlib.suppress(BrokenExecutor):
            submit(int).result(30)


def test_a_request_made_before_the_page_has_loaded_is_answered_after(pool):
    loop, answers = Loop(), []
    requests = _Requests(loop)
    requests.take(TARGET, lambda *answer: answers.append(answer))
    finish(loop)
    assert answers == []
    requests.open()
    finish(loop)
    ((reach, curves),) = answers
    assert reach.exact
    assert curves.exact


def test_only_the_latest_request_is_answered(pool):
    loop, answers = Loop(), []
    requests = _Requests(loop)
    requests.open()
    for runs in (60, 70, 80):
        requests.take((runs, *TARGET[1:]), lambda reach, curves: answers.append(reach.runs))
    finish(loop)
    assert answers == [80]


def test_a_killed_worker_is_replaced_and_the_request_repeated(pool):
    loop, answers = Loop(), []
    requests = _Requests(loop)
    requests.open()
    first = submit(os.getpid).result(30)
    requests.take(TARGET, lambda *answer: answers.append(answer))
    os.kill(first, signal.SIGKILL)
    while not answers:
        finish(loop)
    assert submit(os.getpid).result(30) != first
