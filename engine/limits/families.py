"""The penalties whose limits are known, in the order of their curves from above."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from engine.limits.lasso import lasso_boundary, lasso_witness
from engine.limits.sorted_l1 import sorted_l1_boundary
from engine.limits.sorted_l1_witness import sorted_l1_witness
from engine.limits.two_level import two_level_boundary
from engine.limits.two_level_closed_form import two_level_closed_form
from engine.limits.two_level_witness import two_level_witness
from engine.limits.witness import Witness

__all__ = ["FAMILIES", "Family", "witness"]


@dataclass(frozen=True)
class Family:
    """A penalty: its key in files and options, its name on the screen, its limits.

    `witness` is None for a curve that is not a penalty of its own.
    """

    key: str
    label: str
    boundary: Callable[[Any, Any, Any], Any]
    witness: Callable[[Any, Any, Any], Witness] | None


FAMILIES = {
    family.key: family
    for family in (
        Family("lasso", "lasso", lasso_boundary, lasso_witness),
        Family("two-level-closed-form", "two-level, closed form", two_level_closed_form, None),
        Family("two-level", "two-level", two_level_boundary, two_level_witness),
        Family("sorted-l1", "sorted L1", sorted_l1_boundary, sorted_l1_witness),
    )
}


def witness(penalty: str, tpp: float, sampling_ratio: float, sparsity: float) -> Witness:
    """Return what attains the boundary of `penalty` at a TPP.

    Asymptotic, for iid Gaussian columns.

    Parameters
    ----------
    penalty : str
        'lasso', 'two-level' or 'sorted-l1'.
    tpp, sampling_ratio, sparsity : float
        As for the boundaries.

    Returns
    -------
    Witness

    Raises
    ------
    ValueError
        If the penalty is unknown, an argument is out of its interval, or the penalty has no
        point at the TPP.

    Examples
    --------
    >>> from engine import witness
    >>> witness("lasso", 0.4, 0.3, 0.2).approached
    'some effects have to tend to 0 or to outgrow the noise'
    """
    known = {key: family.witness for key, family in FAMILIES.items() if family.witness}
    if penalty not in known:
        raise ValueError(f"penalty must be one of {', '.join(known)}, not {penalty!r}")
    return known[penalty](tpp, sampling_ratio, sparsity)
