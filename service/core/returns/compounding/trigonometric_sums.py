"""Sums of exp(i u x) over many x, or over many u on a half-shifted grid u_m = (m + 1/2) step.

Each exponential is the product of one over a small step and one over a giant step, so that two tables of about the
square root of the frequencies and one matrix product do. Error eps times the largest phase u x.
"""

from math import ceil, sqrt
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers

Complexes: TypeAlias = npt.NDArray[np.complex128]
BLOCK = 4096


def transform(places: Numbers, weights: Numbers, step: float, count: int) -> Complexes:
    """Give the sum of weights exp(i u_m places) for m = 0 ... count - 1."""
    small = ceil(sqrt(count))
    giant = ceil(count / small)
    inner = np.exp(1j * np.multiply.outer((np.arange(small) + 0.5) * step, places))
    outer = np.exp(1j * np.multiply.outer(np.arange(giant) * (small * step), places)) * weights
    sums: Complexes = (outer @ inner.T).ravel()[:count]
    return sums


def series(points: Numbers, coefficients: Complexes, step: float) -> Numbers:
    """Give the real part of the sum over m of coefficients[j, m] exp(i u_m points), for each row j and each point."""
    rows, count = coefficients.shape
    small = ceil(sqrt(count))
    giant = ceil(count / small)
    table = np.zeros((rows, giant * small), np.complex128)
    table[:, :count] = coefficients
    table = table.reshape(rows, giant, small)
    found = np.empty((rows, points.size))
    for start in range(0, points.size, BLOCK):
        here = points[start : start + BLOCK]
        inner = np.exp(1j * np.multiply.outer((np.arange(small) + 0.5) * step, here))
        outer = np.exp(1j * np.multiply.outer(np.arange(giant) * (small * step), here))
        for row in range(rows):
            found[row, start : start + BLOCK] = ((table[row] @ inner) * outer).sum(axis=0).real
    return found
