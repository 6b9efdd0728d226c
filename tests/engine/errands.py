"""Work for workers, importable in theirs."""

import os
import signal
import time
from pathlib import Path

__all__ = ["die_always", "die_once", "fail_at_two", "square", "takes_long", "threads"]


def square(i):
    return i * i


def threads(i):
    return i, os.environ["OPENBLAS_NUM_THREADS"], os.getpid()


def die_once(folder, i):
    """Kill the worker at piece 3, the first time; the others wait for that to have happened."""
    mark = Path(folder, "died")
    if i == 3 and not mark.exists():
        time.sleep(0.3)  # pieces handed out before have come back by then
        mark.touch()
        os.kill(os.getpid(), signal.SIGKILL)
    return i


def die_always(i):
    if i == 2:
        os.kill(os.getpid(), signal.SIGKILL)
    return i


def fail_at_two(i):
    if i == 2:
        raise ArithmeticError("two")
    return i


def takes_long(i):
    if i > 1:
        time.sleep(60.0)
    return i
