"""The point that stands in for a target: on the boundary, and as near as claimed."""

import math

import numpy as np
import pytest

from engine.limits.families import FAMILIES
from engine.limits.nearest import reachable_tpp

STUDIES = [(0.3, 0.2), (0.7, 0.1), (0.2, 0.5)]
OUT = [(0.8, 0.2), (0.95, 0.05), (0.5, 0.01)]


@pytest.mark.parametrize("study", STUDIES)
@pytest.mark.parametrize("penalty", ["lasso", "sorted-l1"])
def test_keeping_the_fdp(study, penalty):
    boundary = FAMILIES[penalty].boundary
    for tpp, fdp in OUT:
        u = reachable_tpp(penalty, tpp, fdp, *study, "fdp")
        assert boundary(u, *study) <= fdp
        further = boundary(u + 2e-5, *study)  # the last round's spacing is below 1e-5
        assert u == pytest.approx(tpp) or math.isnan(further) or further > fdp


@pytest.mark.parametrize("study", STUDIES)
@pytest.mark.parametrize("penalty", ["lasso", "sorted-l1"])
def test_the_nearest_point_has_no_nearer_one(study, penalty):
    boundary = FAMILIES[penalty].boundary
    nodes = np.linspace(1e-4, 1.0, 400)
    for tpp, fdp in OUT:
        u = reachable_tpp(penalty, tpp, fdp, *study, "nearest")
        if boundary(u, *study) <= fdp:  # within reach: not the nearest, but the target's own
            assert u == tpp
            continue
        away = math.hypot(u - tpp, float(boundary(u, *study)) - fdp)
        others = np.hypot(nodes - tpp, boundary(nodes, *study) - fdp)
        assert away <= np.nanmin(others) + 1e-4


def test_a_target_within_reach_keeps_its_tpp():
    for keeping in ("tpp", "fdp", "nearest"):
        assert reachable_tpp("lasso", 0.4, 0.9, 0.3, 0.2, keeping) == 0.4


def test_no_lasso_beyond_its_power_limit():
    assert math.isnan(reachable_tpp("lasso", 0.8, 0.3, 0.3, 0.2, "tpp"))


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("ridge", 0.5, 0.5, 0.3, 0.2, "tpp"), "penalty must be one of"),
        (("lasso", 0.5, 0.5, 0.3, 0.2, "both"), "keeping must be one of"),
        (("lasso", 0.0, 0.5, 0.3, 0.2, "tpp"), "tpp must be"),
        (("lasso", 0.5, 1.0, 0.3, 0.2, "tpp"), "fdp must be"),
        (("lasso", 0.5, 0.5, 0.0, 0.2, "tpp"), "sampling_ratio must be"),
    ],
)
def test_bad_arguments_are_named(arguments, words):
    with pytest.raises(ValueError, match=words):
        reachable_tpp(*arguments)
