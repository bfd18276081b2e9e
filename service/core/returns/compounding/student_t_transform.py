"""The characteristic function of Student's t."""

import numpy as np
from scipy.special import gammaln, kve

from service.core.arrays import Numbers

MIXED_FROM = 30.0
BELOW, ABOVE = -16.0, 9.0
"""Reach of log W in its deviations: its law falls exponentially below, and faster than any above."""
NODES = 200


def t_transform(degrees_of_freedom: Numbers, u: Numbers) -> Numbers:
    """E[exp(iuT)] for u > 0, T standard Student t, real and positive.

    2^(1-v/2)/Gamma(v/2) y^(v/2) K_(v/2)(y) with y = u sqrt(v) (Hurst 1995); from 30 degrees of freedom, where these
    leave the doubles, as the mean of exp(-u^2/(2W)) over W = chi-square_v/v, by the trapezoidal rule in log W. Absolute
    error 1e-14.
    """
    if degrees_of_freedom >= MIXED_FROM:
        return _by_mixing(degrees_of_freedom / 2, u)
    h = degrees_of_freedom / 2
    y = u * np.sqrt(degrees_of_freedom)
    logs = np.log(2) * (1 - h) - gammaln(h) + h * np.log(y) - y
    transform: Numbers = np.exp(logs + np.log(np.maximum(kve(h, y), 1e-300)))
    return transform


def _by_mixing(h: Numbers, u: Numbers) -> Numbers:
    # log W has density exp(-h (e^x - 1 - x)) but for a constant, with deviation 1/sqrt(h)
    x = np.linspace(BELOW, ABOVE, NODES) / np.sqrt(h)
    weights = np.exp(-h * (np.expm1(x) - x))
    transform: Numbers = np.exp(-np.multiply.outer(u * u / 2, np.exp(-x))) @ (weights / weights.sum())
    return transform
