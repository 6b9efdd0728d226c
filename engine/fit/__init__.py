"""Sorted-L1 fits with a certificate, the lasso among them.

- prox: the proximal map of the sorted-L1 norm, and clusters
- certificate: the duality gap, and zeros that are not settled
- gram, restricted, solver: the working-set solver
"""
