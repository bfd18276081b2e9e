"""Sums and complements of probabilities that are kept as logarithms."""

import numpy as np

from service.core.arrays import Numbers

LOG_HALF = -0.6931471805599453094


def log_complement(log_probability: Numbers) -> Numbers:
    """log(1 - exp(l)) for l <= 0, by expm1 above 1/2 and log1p below. Relative error 2 eps (Maechler 2012)."""
    return np.where(log_probability > LOG_HALF, np.log(-np.expm1(log_probability)), np.log1p(-np.exp(log_probability)))[
        ()
    ]
