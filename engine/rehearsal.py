"""Rehearsals: finite studies drawn from a plan, fitted by several procedures, and counted.

Every replicate has a random stream of its own, a child of the seed, so results depend neither
on the workers nor on their order, and a rehearsal can be extended.
"""

import hashlib
from collections.abc import Callable
from concurrent.futures import Executor
from dataclasses import dataclass, field
from functools import partial
from typing import Any

import numpy as np

from engine.designs import Design, design_of
from engine.fit.arguments import GAP, check_choice, check_weights
from engine.quantities import FDP, ZERO_THRESHOLD, Quantity, shown
from engine.replicate import SELECTIONS, Outcome, Procedure, Replicate, Task, run_replicate
from engine.study import Study
from engine.workers import default_workers, gather

__all__ = [
    "Moments",
    "Outcome",
    "Procedure",
    "Rehearsal",
    "Replicate",
    "Summary",
    "rehearse",
]

REPLICATES = Quantity(
    "replicates", "Replicates", "R", "count",
    "Finite studies drawn and fitted",
    1, 1e6, whole=True,
)  # fmt: skip
SEED = Quantity(
    "seed", "Seed", "", "",
    "Start of the random streams",
    0, 2**63 - 1, whole=True,
)  # fmt: skip
WORKERS = Quantity(
    "workers", "Workers", "", "count",
    "Processes that fit at the same time",
    1, 1024, whole=True,
)  # fmt: skip

# Entries of a design; a worker holds about four copies of it.
_LARGEST = 10**8
# What of a study its draws depend on.
_DRAWN = ("runs", "candidates", "actives", "noise_sd", "effects")


@dataclass(frozen=True)
class Moments:
    """Mean, standard deviation and standard error; None where too few replicates give them."""

    mean: float | None
    sd: float | None
    se: float | None


@dataclass(frozen=True)
class Summary:
    """A procedure over all replicates.

    Attributes
    ----------
    name : str
        The procedure.
    tpp, fdp : Moments
        Over the replicates that have a list.
    replicates, without_list, certified, undecided : int
        Replicates done; those without a list; those whose fit is certified; those with a
        candidate whose being zero is not settled.
    """

    name: str
    tpp: Moments
    fdp: Moments
    replicates: int
    without_list: int
    certified: int
    undecided: int


@dataclass(frozen=True, eq=False)
class Rehearsal:
    """Replicates of a study, as many as are done.

    Attributes
    ----------
    seed : int
        Start of the random streams.
    plan : str
        Digest of all that the outcomes depend on, beside their number.
    names : tuple of str
        The procedures.
    asked : int
        Replicates asked for.
    replicates : tuple of Replicate
        Those done, by index.
    losses : int
        How often workers were lost; what they held was done again.
    reason : str
        Why replicates are missing; empty where none is.
    """

    seed: int
    plan: str = field(repr=False)
    names: tuple[str, ...]
    asked: int
    replicates: tuple[Replicate, ...] = field(repr=False)
    losses: int = 0
    reason: str = ""

    @property
    def seconds(self) -> float:
        """CPU seconds of all replicates."""
        return sum(replicate.seconds for replicate in self.replicates)

    def summaries(self) -> tuple[Summary, ...]:
        """Return mean, spread and standard error of every procedure, in their order."""
        return tuple(map(self._summary, range(len(self.names))))

    def _summary(self, i: int) -> Summary:
        outcomes = [replicate.outcomes[i] for replicate in self.replicates]
        listed = [outcome for outcome in outcomes if not np.isnan(outcome.tpp)]
        return Summary(
            name=self.names[i],
            tpp=_moments([outcome.tpp for outcome in listed]),
            fdp=_moments([outcome.fdp for outcome in listed]),
            replicates=len(outcomes),
            without_list=len(outcomes) - len(listed),
            certified=sum(outcome.certified for outcome in outcomes),
            undecided=sum(outcome.undecided > 0 for outcome in outcomes),
        )


def rehearse(
    study: Study,
    procedures: list[Procedure],
    replicates: int,
    seed: int,
    *,
    design: Design | None = None,
    gap: float = 1e-9,
    workers: int | None = None,
    executor: Executor | None = None,
    earlier: Rehearsal | None = None,
    progress: Callable[[Rehearsal], None] | None = None,
    stopped: Callable[[], bool] = lambda: False,
) -> Rehearsal:
    """Draw finite studies, fit them by every procedure and count what is found.

    Parameters
    ----------
    study : Study
        Runs, candidates, actives, effects and noise. Which candidates are active, and the
        signs, are drawn anew each time; each effect goes to its share of the actives.
    procedures : list of Procedure
        At least one; all see the same data.
    replicates : int
        How many studies, at least 1, `earlier` ones included.
    seed : int
        Start of the random streams, at least 0.
    design : Design, optional
        From `engine.designs.design_of`; iid Gaussian columns by default.
    gap : float
        Relative duality gap of every fit, in (0, 1).
    workers : int, optional
        Processes to start, each with one thread of linear algebra; the cores by default. With
        an `executor`, half the replicates that are with it at a time.
    executor : concurrent.futures.Executor, optional
        Does the work instead of processes of this machine, and is left open.
    earlier : Rehearsal, optional
        The same with fewer replicates: those done are kept and the missing ones added.
    progress : callable, optional
        Called with the rehearsal so far after every replicate, in the caller's thread.
    stopped : callable, optional
        Asked several times a second whether to stop; what is done is returned.

    Returns
    -------
    Rehearsal
        Every replicate's outcomes; `summaries()` has their means and spreads.

    Raises
    ------
    ValueError
        Names the argument, the rule and the value.

    Notes
    -----
    A finite study strays from the asymptotic prediction, which assumes iid Gaussian columns;
    the rehearsal shows by how much. Columns that do not vary in a draw are never selected.

    Examples
    --------
    >>> from concurrent.futures import ThreadPoolExecutor
    >>> from engine.rehearsal import Procedure, rehearse
    >>> from engine.study import study_from
    >>> study = study_from({"schema": "sparsereach/study/1", "runs": 60, "candidates": 100,
    ...     "actives": 5, "noise_sd": 1.0, "effects": [{"size": 1.0, "share": 1.0}]})
    >>> lasso = Procedure("lasso", 3.0)
    >>> with ThreadPoolExecutor(1) as executor:
    ...     done = rehearse(study, [lasso], 10, seed=1, executor=executor)
    >>> summary = done.summaries()[0]
    >>> summary.replicates, summary.certified, summary.tpp.mean > 0.9
    (10, 10, True)
    """
    task = _checked_task(study, procedures, seed, design or design_of(), gap)
    asked = int(REPLICATES.check(replicates))
    count = int(WORKERS.check(default_workers() if workers is None else workers))
    names = tuple(procedure.name for procedure in task.procedures)
    plan = _digest(task)
    done = _kept(earlier, plan, asked)

    def so_far(losses: int = 0, reason: str = "") -> Rehearsal:
        ordered = tuple(done[index] for index in sorted(done))
        return Rehearsal(task.seed, plan, names, asked, ordered, losses, reason)

    def take(replicate: Replicate) -> None:
        done[replicate.index] = replicate
        if progress is not None:
            progress(so_far())

    missing = [index for index in range(asked) if index not in done]
    if not missing:
        return so_far()
    ending = gather(
        partial(run_replicate, task),
        missing,
        take,
        workers=min(count, len(missing)),
        executor=executor,
        stopped=stopped,
    )
    return so_far(ending.losses, ending.reason)


def _moments(values: list[float]) -> Moments:
    count = len(values)
    mean = float(np.mean(values)) if count else None
    sd = float(np.std(values, ddof=1)) if count > 1 else None
    return Moments(mean, sd, None if sd is None else sd / float(np.sqrt(count)))


def _checked_task(study: Any, procedures: Any, seed: Any, design: Any, gap: Any) -> Task:
    if not isinstance(study, Study):
        raise ValueError(f"study must be a Study, not {shown(study)}")
    if study.runs * study.candidates > _LARGEST:
        raise ValueError(
            f"study must have at most {_LARGEST:,} runs times candidates to be rehearsed, "
            f"not {study.runs * study.candidates:,}"
        )
    if study.runs < 2:
        raise ValueError(f"study must have at least 2 runs to be rehearsed, not {study.runs}")
    if not isinstance(design, Design):
        raise ValueError(f"design must be what design_of returned, not {shown(design)}")
    _check_matrix(design, study)
    if not isinstance(procedures, list | tuple) or not procedures:
        raise ValueError(f"procedures must be a list of at least one, not {shown(procedures)}")
    checked = tuple(_checked_procedure(entry, study.candidates) for entry in procedures)
    return Task(study, checked, design, int(SEED.check(seed)), GAP.check(gap))


def _check_matrix(design: Design, study: Study) -> None:
    if design.matrix is None:
        return
    rows, columns = design.matrix.shape
    if columns != study.candidates:
        raise ValueError(
            f"matrix must have a column for each of the {study.candidates} candidates, "
            f"not {columns}"
        )
    if not design.resample and rows != study.runs:
        raise ValueError(
            f"matrix must have a row for each of the {study.runs} runs where its rows are "
            f"taken as they are, not {rows}"
        )


def _checked_procedure(procedure: Any, candidates: int) -> Procedure:
    if not isinstance(procedure, Procedure):
        raise ValueError(f"procedures must hold Procedures, not {shown(procedure)}")
    check_choice("selection", procedure.selection, SELECTIONS)
    weights = check_weights(procedure.weights, candidates)
    cut = procedure.cut
    if procedure.selection == "two-stage":
        cut = ZERO_THRESHOLD.check(cut, "cut")
    elif procedure.selection == "two-stage-bh":
        cut = FDP.check(cut, "cut")
    elif cut is not None:
        raise ValueError(f"cut must be None for the selection 'nonzero', not {shown(cut)}")
    return Procedure(str(procedure.name), weights, procedure.selection, cut)


def _digest(task: Task) -> str:
    data = {key: task.study.to_dict()[key] for key in _DRAWN}
    parts = [data, task.seed, task.gap, task.design.kind, task.design.correlation,
             task.design.frequencies, task.design.resample]  # fmt: skip
    digest = hashlib.sha256(repr(parts).encode())
    if task.design.matrix is not None:
        digest.update(task.design.matrix.tobytes())
    for procedure in task.procedures:
        digest.update(repr((procedure.name, procedure.selection, procedure.cut)).encode())
        digest.update(procedure.weights.tobytes())
    return digest.hexdigest()


def _kept(earlier: Rehearsal | None, plan: str, asked: int) -> dict[int, Replicate]:
    if earlier is None:
        return {}
    if earlier.plan != plan:
        raise ValueError(
            f"earlier must have the same study, procedures, design, seed and gap, "
            f"not those of {shown(earlier)}"
        )
    return {found.index: found for found in earlier.replicates if found.index < asked}
