"""The usual ways to compare before with after: two averages, and a regression with independent noise."""

from __future__ import annotations

import numpy as np
import statsmodels.api as sm
from scipy.stats import ttest_ind

from energytrack.consumption.observations import Observations
from energytrack.inference.model import Model
from energytrack.inference.noise import Array

ALPHA = 0.05
FEWEST = 2  # segments a side that have a spread at all


def consumption(observed: Observations) -> Array:
    return observed.energy / observed.distance_km


def mostly_fitted(observed: Observations) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Segments driven mostly with the part; the one it was fitted in goes to the larger side."""
    return np.asarray(observed.shares[:, 0] > 0.5)


def averages_differ(observed: Observations) -> bool:
    """Welch's (1947) t-test of the averages before and after, looked at once."""
    after = mostly_fitted(observed)
    values = consumption(observed)
    if min(after.sum(), (~after).sum()) < FEWEST:
        return False
    return bool(ttest_ind(values[after], values[~after], equal_var=False).pvalue < ALPHA)


def averages_ever_differ(observed: Observations) -> bool:
    """The same test after every entry, until it says what was hoped for."""
    return any(averages_differ(observed.head(count)) for count in range(2 * FEWEST, len(observed) + 1))


def regression_differs(model: Model) -> bool:
    """Ordinary least squares of consumption on this program's own terms and the part, looked at once."""
    observed = model.observed
    design = np.column_stack([np.ones(len(observed)), observed.shares[:, 0], model.terms.columns(model.conditions)])
    return bool(sm.OLS(consumption(observed), design).fit().pvalues[1] < ALPHA)
