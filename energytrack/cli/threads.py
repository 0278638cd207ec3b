"""One thread of linear algebra: the matrices are small, and threads would only fight each other for the cores."""

from __future__ import annotations

import os

_VARIABLES = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")


def one_thread() -> None:
    """To be called before numpy is imported; what somebody set otherwise stays."""
    for variable in _VARIABLES:
        os.environ.setdefault(variable, "1")
