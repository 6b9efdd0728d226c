"""What the Reach page computes, against the contract functions."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.reach import SEARCHED, exact, exact_curves, swift_curves, swift_reach
from engine.limits.families import FAMILIES

counts = st.tuples(st.integers(20, 4000), st.integers(50, 2000), st.integers(1, 1000)).filter(
    lambda c: c[2] < 0.98 * c[1] and c[0] <= 20 * c[1] and c[2] >= 0.0005 * c[1]
)
share = st.floats(0.01, 1.0)


@settings(max_examples=40, deadline=None)
@given(counts, share, st.floats(0.01, 0.99))
def test_swift_values_stray_from_the_exact_ones_by_no_more_than_they_show(study, tpp, fdp):
    swift = swift_reach((*study, tpp, fdp))
    for key in FAMILIES:
        exact_value = float(FAMILIES[key].boundary(tpp, *swift.study_ratios))
        value = swift.lowest[key]
        if key in SEARCHED or np.isnan(exact_value):
            assert np.isnan(value)
        else:
            # Chords over 64 nodes: the knee of the steepest curves strays most.
            assert value == pytest.approx(exact_value, abs=0.02)


def test_curves_meet_the_boundaries_at_their_nodes():
    curves = exact_curves(0.3, 0.2)
    split = int(np.flatnonzero(np.diff(curves.tpp) == 0.0)[0]) + 1
    for key in SEARCHED:
        for side in (slice(2, split, 2), slice(split, None, 2)):
            expected = FAMILIES[key].boundary(curves.tpp[side], 0.3, 0.2)
            assert curves.fdp[key][side] == pytest.approx(expected, abs=1e-12)


def test_curves_between_nodes_stray_by_less_than_a_pixel():
    curves = exact_curves(0.3, 0.2)
    tpp = np.linspace(0.02, 0.99, 60)
    for key in SEARCHED:
        drawn = np.interp(tpp, curves.tpp, curves.fdp[key])
        # The plane is some 550 pixels high; the kink where the best law changes strays most.
        assert drawn == pytest.approx(FAMILIES[key].boundary(tpp, 0.3, 0.2), abs=1.0 / 550)


def test_without_a_power_limit_the_curves_end_at_tpp_1():
    curves = swift_curves(1.5, 0.1)
    assert curves.tpp[-1] == 1.0
    assert np.all(np.diff(curves.tpp) > 0.0)
    assert not np.isnan(curves.fdp["lasso"]).any()


def test_a_worker_returns_values_and_curves_of_one_study():
    reach, curves = exact((600, 2000, 400, 0.8, 0.75))
    assert reach.exact
    assert curves.exact
    assert reach.lowest["two-level"] == FAMILIES["two-level"].boundary(0.8, 0.3, 0.2)
