"""How often each of several possibilities happens in n independent periods."""

from collections.abc import Sequence
from math import comb

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.kernels.saddle_point import log_binomial_mass


def count_of_compositions(periods: int, kinds: int) -> int:
    """In how many ways n periods fall into so many kinds: C(n + kinds - 1, n)."""
    return comb(periods + kinds - 1, periods)


def compositions(periods: int, probabilities: Numbers, addends: Sequence[Numbers]) -> tuple[Numbers, list[Numbers]]:
    """Give the probability of every composition of n periods, and sums over its periods.

    `addends`: for each sum what one period of each kind adds. The multinomial probabilities are products of binomial
    ones, kind by kind, each without a difference of large terms: error 1e-15 for each kind. Work: the compositions.
    """
    if periods <= 2:
        return _few_periods(periods, probabilities, addends)
    left = np.array([float(periods)])
    masses = np.ones(1)
    sums = [np.zeros(1) for _ in addends]
    remaining = np.cumsum(probabilities[::-1])[::-1]
    for kind in range(probabilities.size - 1):
        choices = left.astype(np.int64) + 1
        parent = np.repeat(np.arange(left.size), choices)
        times = (np.arange(parent.size) - np.repeat(np.cumsum(choices) - choices, choices)).astype(np.float64)
        share = probabilities[kind] / remaining[kind], remaining[kind + 1] / remaining[kind]
        masses = masses[parent] * _binomial_masses(times, left[parent], periods, share)
        sums = [total[parent] + times * one[kind] for total, one in zip(sums, addends, strict=True)]
        left = left[parent] - times
    return masses, [total + left * one[-1] for total, one in zip(sums, addends, strict=True)]


def _few_periods(periods: int, probabilities: Numbers, addends: Sequence[Numbers]) -> tuple[Numbers, list[Numbers]]:
    """One period, or every pair of two, without a step for each kind."""
    if periods == 1:
        return probabilities, list(addends)
    one, other = np.triu_indices(probabilities.size)
    twice = np.where(one == other, 1.0, 2.0)
    return twice * probabilities[one] * probabilities[other], [add[one] + add[other] for add in addends]


def _binomial_masses(hits: Numbers, trials: Numbers, most: int, share: tuple[Numbers, Numbers]) -> Numbers:
    """Binomial probabilities, from a table of all pairs where that is shorter."""
    if hits.size <= (most + 1) ** 2:
        return np.exp(log_binomial_mass(hits, trials, *share))
    k, n = np.arange(most + 1.0), np.arange(most + 1.0)[:, np.newaxis]
    table = np.exp(log_binomial_mass(np.minimum(k, n), n, *share))
    return table[trials.astype(np.intp), hits.astype(np.intp)]
