"""The speed ratios are kept. Those of time are taken from the least disturbed calls."""

import pytest

from tests.bench.engine_ratios import engine_ratios
from tests.bench.fit_ratios import fit_ratios
from tests.bench.latency import latency_ratios


@pytest.fixture(scope="module")
def measured():
    return [*engine_ratios(), *fit_ratios()]


@pytest.mark.parametrize("i", range(8))
def test_engine_ratios(measured, i):
    ratio = measured[i]
    assert ratio.kept, (
        f"{ratio.what}: {ratio.value:.4g} x {ratio.yardstick}, bound {ratio.bound}"
    )


def test_a_step_of_slider_or_handle_takes_little_more_than_a_bare_page():
    """Each ratio at its best of three runs: what else the machine does only ever adds to it."""
    best: dict[str, float] = {}
    for _ in range(3):
        ratios = latency_ratios()
        for ratio in ratios:
            best[ratio.what] = min(ratio.value, best.get(ratio.what, ratio.value))
        if all(best[ratio.what] <= ratio.bound for ratio in ratios):
            return
    pytest.fail(f"not kept in three runs: {best}")
