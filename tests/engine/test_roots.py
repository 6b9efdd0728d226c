import math

import pytest

from engine.roots import least_on, rising_root


@pytest.mark.parametrize(
    ("f", "root"),
    [
        (lambda x: x - 3.0, 3.0),
        (lambda x: math.expm1(x - 2.0), 2.0),
        (lambda x: math.atan(40.0 * (x - 0.5)), 0.5),  # secant steps overshoot
        (lambda x: max(x - 1.0, -0.001), 1.0),  # flat at the start
        (lambda x: math.log(x / 1e-6), 1e-6),  # far below the first stride
    ],
)
def test_rising_root(f, root):
    start = 1e-9
    found = rising_root(f, start, f(start), 0.05, 1e-9)
    assert found == pytest.approx(root, abs=1e-8)


def test_rising_root_takes_few_evaluations():
    calls = []

    def f(x):
        calls.append(x)
        return x**3 - 2.0

    rising_root(f, 1.0, -1.0, 0.05, 1e-7)
    assert len(calls) <= 8


@pytest.mark.parametrize("place", [0.0, 0.3, 1.0])
def test_least_on(place):
    at, value = least_on(lambda x: 1.0 + (x - place) ** 2, 0.0, 1.0, 1e-4)
    assert at == pytest.approx(place, abs=1e-4)
    assert value == 1.0 + (at - place) ** 2
