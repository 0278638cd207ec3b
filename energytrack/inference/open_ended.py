"""A watch without an end: the normal-mixture bound of Robbins (1970), which holds at every moment for ever.

A path of Brownian motion with variance v ever leaves it with a chance of alpha at most. `rho` says where it is
tightest (Howard, Ramdas, McAuliffe and Sekhon, 2021, sections 3.2 and 3.5).
"""

from __future__ import annotations

from math import e, log, sqrt

from scipy.special import lambertw, ndtri


def boundary(variance: float, rho: float, alpha: float) -> float:
    """Two-sided bound on the path itself when its variance has grown to `variance`."""
    total = variance + rho
    return sqrt(total * log(total / (rho * alpha**2)))


def best_rho(variance: float, alpha: float) -> float:
    """The rho that makes the bound tightest at this variance."""
    return variance / (-float(lambertw(-(alpha**2) / e, -1).real) - 1)


def bound(share: float, alpha: float) -> float | None:
    """Bound on |z| at a share of the information needed, tightest at a share of 1; None at 0."""
    return boundary(share, best_rho(1.0, alpha), alpha) / sqrt(share) if share > 0 else None


def drift(alpha: float, power: float) -> float:
    """Standardised true shift found with at least this power by a share of 1; 3.8767 at 0.05 and 0.80.

    Only the crossing at that moment is counted, not those before it, so the power is a little more.
    """
    return boundary(1.0, best_rho(1.0, alpha), alpha) + float(ndtri(power))
