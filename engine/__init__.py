"""What an L1-type penalty can find in a wide screening study, computed.

Rooms, from the ground up (each imports only rooms above it in this list):

- quantities: every user-facing quantity, declared once
- normal: the normal law and the moments of soft thresholding
- arguments: the boundary where arrays are checked
- roots: one-dimensional searches
- limits: whatever the signal: transition, lasso, two-level, sorted L1, and witnesses of each;
  limits/families lists the penalties
- files, run_lengths: strict JSON; weights as runs
- study, shortlist: what the user plans, what the user keeps; their files
- signal, penalties: the normalised signal of a study; a file each family, and the registry
- evolution, walk, predicted, prediction: what a penalty and a selection rule give for it
- schemas: the JSON Schemas of both files
- fit: the certified sorted-L1 solver, for the analysis after the study
- designs, replicate, workers, rehearsal: finite studies drawn and fitted

The engine needs numpy and scipy only. It opens no folder and shows nothing.
"""

from engine.limits.families import witness
from engine.limits.lasso import lasso_boundary
from engine.limits.sorted_l1 import sorted_l1_boundary
from engine.limits.transition import critical_sparsity, power_limit
from engine.limits.two_level import two_level_boundary
from engine.limits.two_level_closed_form import two_level_closed_form
from engine.prediction import predict

__all__ = [
    "critical_sparsity",
    "lasso_boundary",
    "power_limit",
    "predict",
    "sorted_l1_boundary",
    "two_level_boundary",
    "two_level_closed_form",
    "witness",
]
