"""Quantiles of an estimate whose noise is estimated too: a log-normal variance against Student's t."""

from __future__ import annotations

from scipy.special import ndtri, stdtrit

from energytrack.inference.bounds import mixture_quantile
from tests.evidence.block import Block

FREEDOMS, TAILS = (3, 5, 10, 20, 50), (0.025, 1e-3, 1e-5, 1e-8)
HEADING = ("freedom", *(f"one-sided {tail:g}: mixture / t" for tail in TAILS))


def block() -> Block:
    rows = [
        (str(nu), *(f"{mixture_quantile(tail, nu):.2f} / {-float(stdtrit(nu, tail)):.2f}" for tail in TAILS))
        for nu in FREEDOMS
    ]
    known = ("noise known", *(f"{-float(ndtri(tail)):.2f}" for tail in TAILS))
    return Block("quantiles", "", "computed, no sample", HEADING, (*rows, known))
