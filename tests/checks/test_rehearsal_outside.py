"""Rehearsals against values from outside.

"Simulated": by a program that is not part of this project, with a general-purpose lasso.
"""

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from scipy.special import ndtri

from engine.rehearsal import Procedure, rehearse
from engine.study import study_from


def test_two_stage_selection():
    """Simulated, eight draws: n = 600, p = 2000, k = 100, effect 0.2 per standard deviation,
    noise 1, lasso then cut at a predicted FDP of .2: TPP .598(10), FDP .196(6). Formula: a list
    cut by Benjamini-Hochberg at level q has FDP (1 - sparsity) q on average.

    The strength .958 has the smallest tau, by the formulas of *The LASSO risk for Gaussian
    matrices*, IEEE Trans. Inf. Theory 58(4), 2012; the threshold is where nulls and the
    predicted TPP .602 give the FDP. Means of eight draws each: 4 standard errors of their
    difference, plus .015, the finite-size bias seen in such studies.
    """
    study = study_from(
        {
            "schema": "sparsereach/study/1", "runs": 600, "candidates": 2000, "actives": 100,
            "noise_sd": 1.0, "effects": [{"size": 0.2, "share": 1.0}],
        }
    )  # fmt: skip
    threshold = -ndtri(0.2 * 60.2 / (0.8 * 1900) / 2.0)
    procedures = [
        Procedure("cut", 0.958, "two-stage", threshold),
        Procedure("BH", 0.958, "two-stage-bh", 0.2),
    ]
    with ThreadPoolExecutor(1) as executor:
        done = rehearse(study, procedures, 8, seed=3, gap=1e-6, executor=executor)
    by_cut, by_level = done.summaries()
    assert by_cut.certified == by_level.certified == 8
    for found, told, se in ((by_cut.tpp, 0.598, 0.010), (by_cut.fdp, 0.196, 0.006)):
        assert found.mean == pytest.approx(told, abs=4.0 * np.hypot(found.se, se) + 0.015)
    assert by_level.fdp.mean == pytest.approx(0.95 * 0.2, abs=4.0 * by_level.fdp.se + 0.015)
