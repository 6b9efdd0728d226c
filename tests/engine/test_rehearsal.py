"""Rehearsals: the same data for all, streams of their own, counts that are right."""

import re
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from engine.designs import design_of
from engine.fit import cut, debias, fit
from engine.rehearsal import Moments, Outcome, Procedure, Rehearsal, Replicate, rehearse
from engine.study import study_from
from tests.engine.fit.problems import weights_of


def study_of(**changes):
    data = {
        "schema": "sparsereach/study/1", "runs": 60, "candidates": 90, "actives": 9,
        "noise_sd": 1.0, "effects": [{"size": 0.5, "share": 1.0}],
    }  # fmt: skip
    return study_from(data | changes)


STUDY = study_of()
RAMP = 3.0 * weights_of("ramp", 90)
PROCEDURES = [
    Procedure("lasso", 2.5),
    Procedure("ramp", RAMP),
    Procedure("ramp, cut", RAMP, "two-stage", 2.5),
    Procedure("ramp, BH", RAMP, "two-stage-bh", 0.2),
]


@pytest.fixture
def threads():
    with ThreadPoolExecutor(3) as executor:
        yield executor


def rehearsed(executor, replicates=6, seed=5, **options):
    study = options.pop("study", STUDY)
    procedures = options.pop("procedures", PROCEDURES)
    return rehearse(study, procedures, replicates, seed, executor=executor, **options)


def test_outcomes_are_those_of_fit_and_cut(threads):
    """Drawn again from the same streams, and analysed by the public functions."""
    streams = np.random.SeedSequence(5, spawn_key=(2,)).spawn(3)
    for_design, for_effects, for_noise = map(np.random.default_rng, streams)
    X = design_of().draw(60, 90, for_design)
    active = for_effects.permutation(90)[:9]
    effects = np.zeros(90)
    effects[active] = for_effects.choice([-1.0, 1.0], size=9) * 0.5
    y = X @ effects + for_noise.standard_normal(60)
    lasso, ramp = fit(X, y, 2.5), fit(X, y, RAMP)
    lists = [
        lasso.support,
        ramp.support,
        cut(debias(ramp), threshold=2.5).selected,
        cut(debias(ramp), level=0.2).selected,
    ]
    found = rehearsed(threads, 3).replicates[2]
    for outcome, selected in zip(found.outcomes, lists, strict=True):
        true = np.isin(selected, active).sum()
        fdp = (selected.size - true) / max(1, selected.size)
        assert outcome == Outcome(true / 9, fdp, selected.size, True, 0)


class TestStreams:
    def test_results_do_not_depend_on_the_workers(self, threads):
        """Nor on their order: worker processes finish in any."""
        several = rehearsed(threads)
        assert [replicate.index for replicate in several.replicates] == list(range(6))
        processes = rehearse(STUDY, PROCEDURES, 6, 5, workers=2)
        assert processes.replicates == several.replicates
        with ThreadPoolExecutor(1) as executor:
            assert rehearsed(executor).replicates == several.replicates

    def test_an_extended_rehearsal_is_the_long_one(self, threads):
        calls = []
        short = rehearsed(threads, 2)
        longer = rehearsed(threads, 6, earlier=short, progress=calls.append)
        assert longer.replicates == rehearsed(threads, 6).replicates
        assert len(calls) == 4
        assert longer.replicates[0] is short.replicates[0]

    def test_nothing_is_missing_from_an_earlier_one(self, threads):
        full = rehearsed(threads, 3)
        again = rehearsed(threads, 3, earlier=full)
        assert again.replicates == full.replicates
        assert rehearsed(threads, 2, earlier=full).replicates == full.replicates[:2]

    @pytest.mark.parametrize(
        "other",
        [
            {"seed": 6},
            {"study": study_of(noise_sd=2.0)},
            {"design": design_of("heavy")},
            {"gap": 1e-6},
            {"procedures": [*PROCEDURES[:3], Procedure("ramp, BH", RAMP, "two-stage-bh", 0.1)]},
            {"procedures": [Procedure("lasso", 2.6), *PROCEDURES[1:]]},
        ],
        ids=lambda other: next(iter(other)),
    )
    def test_only_the_same_plan_is_extended(self, threads, other):
        earlier = rehearsed(threads, 1)
        assert rehearsed(threads, 1, study=study_of(title="Same"), earlier=earlier).reason == ""
        rule = (
            "earlier must have the same study, procedures, design, seed and gap, not those of"
        )
        with pytest.raises(ValueError, match=rule):
            rehearsed(threads, 1, earlier=earlier, **other)

    def test_another_seed_draws_other_studies(self, threads):
        assert rehearsed(threads).replicates != rehearsed(threads, seed=6).replicates

    def test_procedures_see_the_same_data_whatever_else_is_fitted(self, threads):
        alone = rehearsed(threads, procedures=PROCEDURES[1:2])
        together = rehearsed(threads)
        assert [r.outcomes[0] for r in alone.replicates] == [
            r.outcomes[1] for r in together.replicates
        ]


class TestDraws:
    @pytest.mark.parametrize(
        "options",
        [
            {"kind": "rademacher"},
            {"kind": "counts"},
            {"kind": "heavy"},
            {"kind": "ar1", "correlation": 0.5},
            {"kind": "blocks", "correlation": 0.5},
            {"kind": "own", "matrix": np.random.default_rng(2).normal(size=(80, 90))},
            {"kind": "own", "matrix": np.random.default_rng(2).normal(size=(60, 90)),
             "resample": False},
        ],
        ids=lambda options: options["kind"],
    )  # fmt: skip
    def test_every_design_is_fitted_to_its_certificate(self, threads, options):
        found = rehearsed(threads, 3, design=design_of(**options))
        for summary in found.summaries():
            assert (summary.replicates, summary.certified) == (3, 3)

    def test_columns_that_do_not_vary_are_never_selected(self, threads):
        """With ones this rare, most columns of a draw are all zeros."""
        design = design_of("counts", frequencies=(0.005, 0.0))
        found = rehearsed(threads, 3, design=design)
        assert all(summary.certified == 3 for summary in found.summaries())
        none = design_of("counts", frequencies=(1e-12, 0.0))
        outcomes = rehearsed(threads, 1, design=none).replicates[0].outcomes
        assert outcomes == (Outcome(0.0, 0.0, 0, True, 0),) * 4

    def test_each_effect_goes_to_its_share_of_the_actives(self, threads):
        """Large effects are all found, minute ones hardly ever."""
        effects = [{"size": 50.0, "share": 0.35}, {"size": 1e-9, "share": 0.65}]
        found = rehearsed(threads, 4, study=study_of(effects=effects))
        # A share of .35 of 9 actives is 3.15: three.
        assert all(r.outcomes[0].tpp >= 3 / 9 for r in found.replicates)
        only = Procedure("large", 1000.0 / np.sqrt(60), "nonzero")
        found = rehearsed(threads, 4, study=study_of(effects=effects), procedures=[only])
        assert [r.outcomes[0].tpp for r in found.replicates] == [3 / 9] * 4

    @pytest.mark.parametrize("spread", ["normal", "exponential"])
    def test_spread_effects(self, threads, spread):
        effects = [{"spread": spread, "scale": 1.0, "share": 1.0}]
        summary = rehearsed(threads, study=study_of(effects=effects)).summaries()[0]
        assert 0.0 < summary.tpp.mean < 1.0

    def test_the_noise_has_its_unit(self, threads):
        """Everything in a unit a thousand times as large gives the same lists."""
        large = study_of(noise_sd=1000.0, effects=[{"size": 500.0, "share": 1.0}])
        scaled = [
            Procedure(p.name, np.multiply(1000.0, p.weights), p.selection, p.cut)
            for p in PROCEDURES
        ]
        found = rehearsed(threads, study=large, procedures=scaled)
        assert found.replicates == rehearsed(threads).replicates


class TestSummaries:
    def replicate(self, index, tpp, fdp=0.5, certified=True, undecided=0):
        return Replicate(index, (Outcome(tpp, fdp, 3, certified, undecided),), 0.25)

    def test_moments(self):
        tpp = [0.2, 0.4, 0.9]
        done = Rehearsal(1, "", ("one",), 3, tuple(map(self.replicate, range(3), tpp)))
        (summary,) = done.summaries()
        assert summary.tpp.mean == pytest.approx(0.5)
        assert summary.tpp.sd == pytest.approx(np.std(tpp, ddof=1))
        assert summary.tpp.se == pytest.approx(np.std(tpp, ddof=1) / np.sqrt(3))
        assert summary.fdp == Moments(0.5, 0.0, 0.0)
        assert done.seconds == 0.75

    def test_no_number_that_is_not_there(self):
        assert Rehearsal(1, "", ("one",), 3, ()).summaries()[0].tpp == Moments(None, None, None)
        one = Rehearsal(1, "", ("one",), 3, (self.replicate(0, 0.2),))
        assert one.summaries()[0].tpp == Moments(0.2, None, None)

    def test_replicates_without_a_list_are_counted_apart(self):
        nan = float("nan")
        replicates = self.replicate(0, nan, nan, False), self.replicate(1, 0.4, 0.1, True, 2)
        (summary,) = Rehearsal(1, "", ("one",), 2, replicates).summaries()
        assert (summary.replicates, summary.without_list) == (2, 1)
        assert (summary.certified, summary.undecided) == (1, 1)
        assert summary.fdp.mean == 0.1

    def test_a_fit_with_as_many_magnitudes_as_runs_has_no_two_stage_list(self, threads):
        close = Procedure("close", 1e-4, "two-stage", 2.0)
        summary = rehearsed(threads, 2, procedures=[close]).summaries()[0]
        assert (summary.replicates, summary.without_list) == (2, 2)
        assert summary.tpp == Moments(None, None, None)


def test_a_stop_keeps_what_is_done(threads):
    seen = []
    found = rehearsed(threads, 500, progress=seen.append, stopped=lambda: len(seen) >= 3)
    assert found.reason == "stopped"
    assert found.asked == 500 > len(found.replicates) >= 3
    assert found.replicates == seen[-1].replicates
    more = rehearsed(threads, len(found.replicates), earlier=found)
    assert more.reason == ""


def test_progress_sees_each_replicate(threads):
    counts = []
    rehearsed(threads, 4, progress=lambda so_far: counts.append(len(so_far.replicates)))
    assert counts == [1, 2, 3, 4]


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"study": {}}, "study must be a Study, not {}"),
        ({"study": study_of(runs=10**5, candidates=10**6)},
         "study must have at most 100,000,000 runs times candidates to be rehearsed, "
         "not 100,000,000,000"),
        ({"study": study_of(runs=1)}, "study must have at least 2 runs to be rehearsed, not 1"),
        ({"procedures": []}, "procedures must be a list of at least one, not []"),
        ({"procedures": ["lasso"]}, "procedures must hold Procedures, not 'lasso'"),
        ({"procedures": [Procedure("x", [1.0, 2.0])]},
         "weights must be one number or 90, one a column of X, not an array of shape (2,)"),
        ({"procedures": [Procedure("x", 1.0, "all")]},
         "selection must be 'nonzero' or 'two-stage' or 'two-stage-bh', not 'all'"),
        ({"procedures": [Procedure("x", 1.0, "nonzero", 2.0)]},
         "cut must be None for the selection 'nonzero', not 2"),
        ({"procedures": [Procedure("x", 1.0, "two-stage")]},
         "cut must be a finite number at least 0, not None"),
        ({"procedures": [Procedure("x", 1.0, "two-stage-bh", 1.5)]},
         "cut must be a finite number above 0 and below 1, not 1.5"),
        ({"replicates": 0}, "replicates must be a whole number at least 1 and at most 1000000, "
         "not 0"),
        ({"seed": -1},
         "seed must be a whole number at least 0 and at most 9223372036854775807, not -1"),
        ({"workers": 0}, "workers must be a whole number at least 1 and at most 1024, not 0"),
        ({"design": "gaussian"}, "design must be what design_of returned, not 'gaussian'"),
        ({"design": design_of("own", matrix=np.eye(5))},
         "matrix must have a column for each of the 90 candidates, not 5"),
        ({"design": design_of("own", matrix=np.eye(90), resample=False)},
         "matrix must have a row for each of the 60 runs where its rows are taken as they are, "
         "not 90"),
    ],
)  # fmt: skip
def test_refusals(threads, options, message):
    with pytest.raises(ValueError, match=f"^{re.escape(message)}$"):
        rehearsed(threads, **options)
