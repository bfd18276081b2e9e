"""A lognormal growth factor by the mean and standard deviation of its return."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Moments


def log_parameters(expected_return: Numbers, volatility: Numbers) -> tuple[Numbers, Numbers]:
    """Mean and variance of log growth (Aitchison & Brown 1957).

    The variance is s^2 = log(1 + volatility^2/(1 + expected_return)^2), the mean log(1 + expected_return) - s^2/2.
    """
    variance = np.log1p(_relative_variance(expected_return, volatility))
    return np.log1p(expected_return) - variance / 2, variance


def growth_return_moments(expected_return: Numbers, volatility: Numbers) -> Moments:
    """Moments of the return; skewness and kurtosis of a point mass are nan."""
    square = _relative_variance(expected_return, volatility)
    mean, deviation, square = np.broadcast_arrays(expected_return, volatility, square)
    w = 1 + square
    spread = deviation > 0
    skewness = np.where(spread, np.sqrt(square) * (3 + square), NO_VALUE)
    excess = np.where(spread, square * (((w + 3) * w + 6) * w + 6), NO_VALUE)
    return Moments(mean, deviation, skewness, excess)


def _relative_variance(expected_return: Numbers, volatility: Numbers) -> Numbers:
    return (volatility / (1 + expected_return)) ** 2
