"""Sorted-L1 fits with a certificate, the lasso among them.

- arguments, scaling: what is let in; columns and loss as the solver has them
- prox: the proximal map of the sorted-L1 norm, and clusters
- certificate: the duality gap, and zeros that are not settled
- gram, restricted, solver: the working-set solver
- fitting: fits for the analysis of a study
- two_stage: debiased fits and cuts
"""

from engine.fit.fitting import Fit, fit, path
from engine.fit.two_stage import Cut, Debiased, cut, debias

__all__ = ["Cut", "Debiased", "Fit", "cut", "debias", "fit", "path"]
