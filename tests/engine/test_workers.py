"""Workers: every piece once, one thread each, losses made good, stops keep what is done."""

import os
import time
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from functools import partial

import pytest

from engine.workers import Ending, default_workers, gather
from tests.engine.errands import (
    die_always,
    die_once,
    fail_at_two,
    square,
    takes_long,
    threads,
)


def gathered(work, count, workers=2, **options):
    results = []
    ending = gather(work, list(range(count)), results.append, workers=workers, **options)
    return results, ending


def test_every_piece_is_done_once():
    results, ending = gathered(square, 20)
    assert sorted(results) == [i * i for i in range(20)]
    assert ending == Ending("", 0)


def test_workers_have_one_thread_and_this_process_keeps_its_own(monkeypatch):
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "7")
    monkeypatch.delenv("MKL_NUM_THREADS", raising=False)
    results, _ = gathered(threads, 6)
    assert {told for _, told, _ in results} == {"1"}
    assert os.getpid() not in {process for _, _, process in results}
    assert os.environ["OPENBLAS_NUM_THREADS"] == "7"
    assert "MKL_NUM_THREADS" not in os.environ


def test_nothing_to_do():
    assert gathered(square, 0) == ([], Ending("", 0))


def test_a_killed_worker_loses_no_finished_piece(tmp_path):
    results, ending = gathered(partial(die_once, str(tmp_path)), 12)
    assert sorted(results) == list(range(12))
    assert (ending.reason, ending.losses) == ("", 1)


def test_a_piece_that_kills_every_worker_is_given_up_and_reported():
    results, ending = gathered(die_always, 4)
    assert sorted(results) == [0, 1, 3]
    assert ending.reason == "workers were lost, 3 times in a row"
    assert ending.losses >= 3


def test_a_piece_that_fails_is_tried_again_after_the_others_and_reported():
    with ThreadPoolExecutor(2) as executor:
        results, ending = gathered(fail_at_two, 6, executor=executor)
    assert sorted(results) == [0, 1, 3, 4, 5]
    assert ending.reason == "replicate 2 failed: ArithmeticError: two, 3 times in a row"


def test_a_stop_comes_within_a_second_and_keeps_what_is_done():
    results, asked = [], []

    def stopped():
        if len(results) == 2 and not asked:
            asked.append(time.monotonic())
        return bool(asked)

    ending = gather(takes_long, list(range(5)), results.append, workers=2, stopped=stopped)
    assert time.monotonic() - asked[0] < 1.0
    assert sorted(results) == [0, 1]
    assert ending == Ending("stopped", 0)


def test_an_error_of_the_taker_ends_the_workers():
    def refuse(result):
        raise LookupError

    start = time.monotonic()
    with pytest.raises(LookupError):
        gather(takes_long, list(range(4)), refuse, workers=2)
    assert time.monotonic() - start < 20.0  # a piece takes 60 seconds


class GivesUp(Executor):
    """Cancels every second piece it is handed."""

    def __init__(self):
        self.handed = 0

    def submit(self, work, /, *arguments):
        future = Future()
        self.handed += 1
        if self.handed % 2:
            future.cancel()
            future.set_running_or_notify_cancel()
        else:
            future.set_result(work(*arguments))
        return future


def test_what_an_executor_gives_up_is_done_again():
    results, ending = gathered(square, 5, executor=GivesUp())
    assert sorted(results) == [0, 1, 4, 9, 16]
    assert (ending.reason, ending.losses > 0) == ("", True)


def test_an_executor_that_is_shut_down_is_reported():
    executor = ThreadPoolExecutor(1)
    executor.shutdown()
    assert gathered(square, 5, executor=executor) == ([], Ending("the executor broke", 1))


def test_default_workers_are_at_least_one():
    assert default_workers() >= 1
