"""Complements and smaller sides of probabilities, kept as logarithms."""

import numpy as np

from service.core.arrays import Numbers, Truths

LOG_HALF = -0.6931471805599453094


def log_complement(log_probability: Numbers) -> Numbers:
    """Give log(1 - exp(l)) for l <= 0, by expm1 above 1/2 and log1p below. Relative error 2 eps (Maechler 2012)."""
    return np.where(log_probability > LOG_HALF, np.log(-np.expm1(log_probability)), np.log1p(-np.exp(log_probability)))[
        ()
    ]


def smaller_tail(probability: Numbers, upper: bool) -> tuple[Numbers, Truths]:
    """Turn a tail above 1/2 into the other one, with probability 1 - p exactly: (probability, is it the lower tail)."""
    large = probability > 0.5
    return np.where(large, 1 - probability, probability)[()], np.asarray(large == upper)
