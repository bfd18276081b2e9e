"""Moments of a mixture from those of its components."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Moments


def mixed_moments(weights: Numbers, parts: Moments) -> Moments:
    """Moments of the law that is component i with probability weights[i]; skewness of a constant is nan.

    Centred about the mixture's mean before any power; those of the components are added with their binomials.
    """
    mean = weights @ parts.mean
    # a power of two as unit: scaling is exact, and no fourth power leaves the doubles
    size = np.maximum(np.abs(parts.mean - mean).max(), parts.standard_deviation.max())
    unit = np.ldexp(1.0, np.frexp(size)[1])
    d, s = (parts.mean - mean) / unit, parts.standard_deviation / unit
    variance = weights @ (d * d + s * s)
    if variance == 0:
        return Moments(mean, variance, NO_VALUE, NO_VALUE)
    own_third = np.where(s > 0, parts.skewness, 0.0) * s**3
    own_fourth = (np.where(s > 0, parts.excess_kurtosis, 0.0) + 3) * s**4
    third = weights @ (d**3 + 3 * d * s * s + own_third)
    fourth = weights @ (d**4 + 6 * d * d * s * s + 4 * d * own_third + own_fourth)
    return Moments(mean, unit * np.sqrt(variance), third / variance**1.5, fourth / variance**2 - 3)
