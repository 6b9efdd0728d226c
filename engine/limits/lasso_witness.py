"""The witness of the lasso boundary, beside those of the other penalties."""

from engine.limits.lasso import lasso_witness

__all__ = ["lasso_witness"]
