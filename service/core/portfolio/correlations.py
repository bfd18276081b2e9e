"""Correlation matrices: what returns can have, and the nearest one where a matrix is none."""

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit, Refusal

ROUNDING = 1e-9
LEAST_EIGENVALUE = -1e-8
MOST_ROUNDS = 300
SETTLED = 1e-9
LARGEST_HINT = 50
"""The nearest matrix is named for so many rows at most."""


def checked_correlations(correlations: Numbers, count: int, path: tuple[str, ...]) -> Numbers:
    """Give the matrix, symmetric and without a negative eigenvalue, or refuse what cannot be correlations of `count`.

    Asymmetry and a diagonal off 1 by 1e-9, and eigenvalues down to -1e-8, count as rounding and are mended.
    """
    if correlations.shape != (count, count):
        words = f"{path[-1]} must have {count} rows of {count} numbers."
        raise DoesNotFit([Refusal(path, "lengths_differ", words, {"expected": count})])
    slanted = np.abs(correlations - correlations.T) > ROUNDING
    off_one = np.abs(np.diag(correlations) - 1) > ROUNDING
    if slanted.any() or off_one.any():
        words = f"{path[-1]} must be symmetric, with 1 on the diagonal."
        raise DoesNotFit([Refusal(path, "not_a_correlation_matrix", words)])
    even = (correlations + correlations.T) / 2
    values, vectors = np.linalg.eigh(even)
    least = float(values[0])
    if least >= 0:
        return even
    if least >= LEAST_EIGENVALUE:
        return np.asarray(vectors @ (np.maximum(values, 0)[:, None] * vectors.T), np.float64)
    words = f"No returns can have these correlations: the smallest eigenvalue of the matrix is {least:.6g}."
    params: dict[str, object] = {"smallest_eigenvalue": least}
    if count <= LARGEST_HINT:
        words += " The nearest matrix that some can have is given under params."
        params["nearest"] = np.round(nearest_correlations(even), 6).tolist()
    raise DoesNotFit([Refusal(path, "not_a_correlation_matrix", words, params)])


def nearest_correlations(matrix: Numbers) -> Numbers:
    """Give the correlation matrix nearest to a symmetric one in the Frobenius norm.

    Alternating projections on the positive semidefinite matrices and on those of unit diagonal, the first with
    Dykstra's correction (Higham 2002); a last small shrinkage towards independence makes up for ending early.
    """
    correction, found = np.zeros_like(matrix), matrix.copy()
    for _ in range(MOST_ROUNDS):
        before = found
        corrected = found - correction
        values, vectors = np.linalg.eigh(corrected)
        definite = vectors @ (np.maximum(values, 0)[:, None] * vectors.T)
        correction = definite - corrected
        found = definite.copy()
        np.fill_diagonal(found, 1.0)
        if np.abs(found - before).max() < SETTLED:
            break
    short = max(-float(np.linalg.eigvalsh(found)[0]), 0.0) + 2e-6  # rounding to six digits must not spoil it
    return np.asarray((found + short * np.eye(matrix.shape[0])) / (1 + short), np.float64)
