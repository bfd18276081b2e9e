"""The probability of an interval, where the difference of two tails keeps its digits and where it does not."""

import numpy as np

from service.core.arrays import MINUS_INFINITY, Numbers, Truths
from service.core.distributions.family import Family
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.quadrature import MEDIUM

EPS = np.finfo(np.float64).eps
NARROW = np.log(0.75)
"""Logarithm of the ratio of the two tails from which on their difference loses digits."""
FEW = 64
"""So many masses of a discrete law are summed one by one."""


def between(law: Family, low: Numbers, high: Numbers) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Probability of low < X <= high, of the rest, and the logarithms of both.

    F(high) - F(low) is taken on the side where the tails are smaller. Where they are nearly equal, their difference
    has few digits left: then the density is integrated over the interval (36-point Gauss-Legendre), or up to 64 masses
    are summed. Such a figure is used only where it agrees with the difference to within the latter's rounding, so it
    cannot be worse (a kink of the density within the interval, say). Error: that of the tails, a few eps more.
    """
    tails_low, logs_low = law.tails_and_logs(low)
    tails_high, logs_high = law.tails_and_logs(high)
    empty = high <= low
    complement = np.where(empty, 1, tails_low.at_most + tails_high.above)
    left = logs_high.at_most <= logs_low.above
    log_more = np.where(left, logs_high.at_most, logs_low.above)
    log_less = np.where(left, logs_low.at_most, logs_high.above)
    ratio = np.where(empty | np.isneginf(log_more), 0, log_less - log_more)
    probability = np.where(left, tails_high.at_most - tails_low.at_most, tails_low.above - tails_high.above)
    log_probability = np.where(complement < 0.5, np.log1p(-complement), log_more + log_complement(np.minimum(ratio, 0)))
    narrow = (ratio > NARROW) & ~empty
    if narrow.any():
        width = np.where(narrow, high - low, 0)
        direct = _log_sum(law, low, high) if law.discrete else _log_integral(law, low, width)
        rounding = 8 * EPS * (16 - log_more) / np.abs(np.expm1(ratio))
        better = narrow & (np.abs(direct - log_probability) <= rounding)
        log_probability = np.where(better, direct, log_probability)
        probability = np.where(better, np.exp(direct), probability)
    probability = np.where(empty, 0, probability)
    log_probability = np.where(empty, MINUS_INFINITY, log_probability)
    log_rest = np.where(probability < 0.5, np.log1p(-probability), np.logaddexp(logs_low.at_most, logs_high.above))
    return probability[()], complement[()], log_probability[()], log_rest[()]


def _log_integral(law: Family, low: Numbers, width: Numbers) -> Numbers:
    """Logarithm of the integral of the density over [low, low + width], scaled by its greatest value at the nodes."""
    logs = law.log_density(low + MEDIUM.over(width))
    top = logs.max(axis=0)
    integral: Numbers = top + np.log(width * MEDIUM.mean(np.exp(logs - top)))
    return integral


def _log_sum(law: Family, low: Numbers, high: Numbers) -> Numbers:
    """Logarithm of the sum of the masses at the whole numbers in (low, high]; nan where there are more than 64."""
    first, last = np.floor(low) + 1, np.floor(high)
    count: Numbers = last - first + 1
    most = int(np.max(np.where(count <= FEW, count, 0), initial=0))
    values = first + np.arange(max(most, 1), dtype=np.float64).reshape((-1,) + (1,) * np.ndim(count))
    inside: Truths = values <= last
    logs = np.where(inside, law.log_density(values), MINUS_INFINITY)
    top = logs.max(axis=0)
    return np.where(count <= FEW, top + np.log(np.exp(logs - top).sum(axis=0)), np.nan)
