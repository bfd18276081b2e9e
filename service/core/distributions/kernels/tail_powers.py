"""Moments of the power-law tail."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Moments


def pareto_moments(c: Numbers) -> Moments:
    """Moments of the generalized Pareto law of location 0, scale 1 and shape c, in closed form. Error 4 eps.

    Infinite from c = 1/k for the k-th moment; skewness and kurtosis have no value where the variance is infinite.
    """
    mean = np.where(c < 1, 1 / (1 - c), np.inf)
    beyond = np.where(2 * c < 1, np.inf, np.nan)
    spread = np.where(2 * c < 1, mean / np.sqrt(1 - 2 * c), np.where(c < 1, np.inf, np.nan))
    skewness = 2 * (1 + c) * np.sqrt(1 - 2 * c) / (1 - 3 * c)
    excess = 6 * (1 + c - c * c * (6 + 2 * c)) / ((1 - 3 * c) * (1 - 4 * c))
    return Moments(
        mean[()], spread[()], np.where(3 * c < 1, skewness, beyond)[()], np.where(4 * c < 1, excess, beyond)[()]
    )
