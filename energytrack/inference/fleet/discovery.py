"""Many vehicles looked at at once: how many of those called would be called by chance."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from energytrack.inference.noise import Array


def adjusted(p_values: Sequence[float]) -> Array:
    """Adjusted p-values (n,), in the order given (Benjamini and Hochberg, 1995).

    Calling those at or below q keeps the expected share of false calls at q, where the vehicles are independent or
    positively dependent (Benjamini and Yekutieli, 2001), as a common season makes them.
    """
    p = np.asarray(p_values, dtype=np.float64)
    order = np.argsort(p)[::-1]  # largest first
    rank = np.arange(len(p), 0, -1)
    found = np.empty(len(p))
    found[order] = np.minimum(np.minimum.accumulate(p[order] * len(p) / rank), 1.0)
    return found
