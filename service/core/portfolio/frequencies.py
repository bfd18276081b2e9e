"""A probability as "so many of so many", for a client's eyes."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers, Truths

SIZES = (100, 1_000, 10_000, 100_000, 1_000_000)
TOLERANCE = 0.1
"""A count may miss the smaller of probability and complement by a tenth of it."""
RESOLVED = 10.0
"""A probability below so many numerical errors is not told from 0."""


@dataclass(frozen=True, slots=True)
class Frequencies:
    """`count` of `out_of`; `bound` is "about", "at_most", "at_least" or "exactly"."""

    count: npt.NDArray[np.int64]
    out_of: npt.NDArray[np.int64]
    bound: npt.NDArray[np.str_]


def frequencies(probability: Numbers, certain: Truths, numerical_error: float) -> Frequencies:
    """Choose the smallest of 100, 1,000, ... 1,000,000 in which the rounded count is right within a tenth.

    Where none is, or the figure is lost in the numerical error: "at_most" so many in a million, the error added, at
    least 1 (near certainty "at_least", never all). 0 and 1 are "exactly" only where `certain`. Arrays of one shape.
    """
    p = np.asarray(probability, np.float64)
    smaller = np.minimum(p, 1 - p)
    largest = SIZES[-1]
    resolved = smaller >= RESOLVED * numerical_error
    rare = np.clip(np.ceil((p + numerical_error) * largest), 1, largest)
    common = np.clip(np.floor((p - numerical_error) * largest), 0, largest - 1)
    count = np.where(p < 0.5, rare, common)
    out_of = np.full(p.shape, largest)
    bound = np.where(p < 0.5, "at_most", "at_least")
    for size in reversed(SIZES):
        close = resolved & (np.abs(np.rint(p * size) / size - p) <= TOLERANCE * smaller)
        count = np.where(close, np.rint(p * size), count)
        out_of = np.where(close, size, out_of)
        bound = np.where(close, "about", bound)
    exact = np.asarray(certain) & ((p == 0) | (p == 1))
    return Frequencies(
        np.where(exact, p * SIZES[0], count).astype(np.int64),
        np.where(exact, SIZES[0], out_of),
        np.where(exact, "exactly", bound),
    )
