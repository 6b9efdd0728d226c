"""Exact values from a worker: rested, latest only, and in spite of a broken pool."""

import contextlib
import os
import signal
import time
from concurrent.futures import BrokenExecutor, Future

import pytest

from app import evaluation
from app.evaluation import _Requests, start_workers, submit
from app.reach import exact

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


@pytest.fixture(autouse=True)
def unheld(monkeypatch):
    """The stand-in for a document holds no messages."""
    monkeypatch.setattr(evaluation, "hold", contextlib.nullcontext)


@pytest.fixture
def pool():
    """Give each test a worker of its own, and every job time to end."""
    start_workers.cache_clear()
    yield
    start_workers().shutdown()
    start_workers.cache_clear()


def finish(loop):
    """Run the loop long enough for the workers to have said all they have to say."""
    submit(int).result(30)  # a worker has started
    for _ in range(30):
        loop.run()
        time.sleep(0.05)


def test_a_request_made_before_the_page_has_loaded_is_answered_after(pool):
    loop, answers = Loop(), []
    requests = _Requests(loop, exact)
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
    requests = _Requests(loop, exact)
    requests.open()
    for runs in (60, 70, 80):
        requests.take((runs, *TARGET[1:]), lambda reach, curves: answers.append(reach.runs))
    finish(loop)
    assert answers == [80]


def test_a_request_whose_worker_died_is_made_once_more(monkeypatch):
    """The pool says 'broken' for the job of a killed worker, and for all it gets after."""
    loop, answers, asked = Loop(), [], []
    requests = _Requests(loop, exact)
    requests.open()

    def submit_(function, target):
        asked.append(target)
        future = Future()
        if len(asked) == 1:
            future.set_exception(BrokenExecutor())
        else:
            future.set_result(function(target))
        return future

    monkeypatch.setattr(evaluation, "submit", submit_)
    requests.take(TARGET, lambda *answer: answers.append(answer))
    for _ in range(4):
        loop.run()
    assert asked == [TARGET, TARGET]
    assert answers[0][0].exact


def test_it_gives_up_after_the_second_try(monkeypatch):
    loop, asked = Loop(), []
    requests = _Requests(loop, exact)
    requests.open()

    def submit_(function, target):
        asked.append(target)
        future = Future()
        future.set_exception(BrokenExecutor())
        return future

    monkeypatch.setattr(evaluation, "submit", submit_)
    requests.take(TARGET, lambda *answer: None)
    for _ in range(6):
        loop.run()
    assert len(asked) == 2


def test_a_killed_worker_is_replaced(pool):
    """A real one, killed between two requests."""
    loop, answers = Loop(), []
    requests = _Requests(loop, exact)
    requests.open()
    os.kill(submit(os.getpid).result(30), signal.SIGKILL)
    requests.take(TARGET, lambda *answer: answers.append(answer))
    for _ in range(100):
        loop.run()
        if answers:
            break
        time.sleep(0.1)
    assert answers[0][0].exact
