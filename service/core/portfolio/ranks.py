"""Ranks with ties, and Kendall's agreement between two of them."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.returns.laws.collected import Positions

RELATIVE_TIE = 1e-12
NO_RANK = 0
MATRIX_TYPE = np.float32
"""Holds whole numbers up to 2^24 exactly, more than there are pairs of 1,000 portfolios in both directions."""


def ranked(values: Numbers, higher_is_better: bool, numerical_error: float) -> tuple[Positions, Positions]:
    """Give the positions best first, and each position's rank.

    Neighbours are tied when they differ by at most max(1e-12 |value|, numerical_error), and so, chained, are their
    neighbours; ties share the smallest rank and stand in the order given. nan comes last, with rank 0.
    """
    key = -values if higher_is_better else values
    order = np.argsort(key, kind="stable")
    before, after = key[order][:-1], key[order][1:]
    step = np.subtract(after, before, out=np.full(before.shape, np.inf), where=np.isfinite(before) & np.isfinite(after))
    size = np.maximum(np.abs(before), np.abs(after), where=np.isfinite(step), out=np.zeros(step.shape))
    tied = (before == after) | (step <= np.maximum(RELATIVE_TIE * size, numerical_error))
    group = np.concatenate([[0], np.cumsum(~tied)])
    order = order[np.lexsort((order, group))]
    first = np.flatnonzero(np.concatenate([[True], ~tied]))
    ranks = np.empty(order.shape, np.int64)
    ranks[order] = first[group] + 1
    ranks[np.isnan(values)] = NO_RANK
    return order, ranks


def kendall_tau_b(ranks: list[Positions]) -> Numbers:
    """Kendall's tau-b (1945) between every two of the rankings, over the portfolios that have a rank in both.

    `ranks`: each of length k; the answer is a square matrix, nan where one of the two ties all. Work k^2 each.
    """
    signs = np.empty((len(ranks), ranks[0].size ** 2), MATRIX_TYPE)
    known = np.empty_like(signs)
    for row, (sign, rank) in enumerate(zip(signs, ranks, strict=True)):
        has = rank != NO_RANK
        known[row] = np.logical_and.outer(has, has).ravel()
        sign[:] = np.sign(np.subtract.outer(rank, rank)).ravel() * known[row]
    agreeing = np.asarray(signs @ signs.T, np.float64)
    untied = np.asarray(np.abs(signs) @ known.T, np.float64)
    scale = np.sqrt(untied * untied.T)
    return np.where(scale > 0, agreeing / np.maximum(scale, 1), NO_VALUE)
