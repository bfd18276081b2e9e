"""Integrals over the standard normal law below a point, from positive terms alone."""

from collections.abc import Callable
from itertools import pairwise

import numpy as np

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.quadrature import MEDIUM
from service.core.returns.mills import normal_density

REACH = 9.0
"""Beyond so many standard deviations the normal law holds less than 1e-18."""
PANELS = np.array([0, 1e-4, 1e-3, 0.006, 0.03, 0.1, 0.25, 0.45, 0.7, 1])
BLOCK = 500

OfDistance = Callable[..., Numbers]
"""A function of the distance t below z, of z, and of further parameters, which all broadcast."""


def moments_below(function: OfDistance, z: Numbers, *parameters: Numbers) -> tuple[Numbers, Numbers]:
    """E[f(z - Z); Z < z] and E[f(z - Z)^2; Z < z] for Z standard normal and f(t, z, *parameters) >= 0.

    Nine panels of 36 points, finer towards z, down to where the density has fallen to exp(-40) of its greatest below z.
    For polynomials and saturating exponentials: 1e-14 relative.
    """
    shape, (z, *rest) = flat(z, *parameters)
    first, second = np.zeros(z.size), np.zeros(z.size)
    for start in range(0, z.size, BLOCK):
        i = slice(start, start + BLOCK)
        first[i], second[i] = _by_panels(function, z[i], [p[i] for p in rest])
    return first.reshape(shape), second.reshape(shape)


def _by_panels(function: OfDistance, z: Numbers, parameters: list[Numbers]) -> tuple[Numbers, Numbers]:
    x = np.maximum(-z, 0.0)
    skipped = np.maximum(z - REACH, 0.0)  # between z and where the density is noticeable
    width = np.where(z <= 0, 80 / (x + np.sqrt(x * x + 80)), np.minimum(z, REACH) + REACH)
    peak = np.where(z <= 0, normal_density(z), normal_density(np.zeros_like(z)))
    first, second = np.zeros(z.size), np.zeros(z.size)
    for begin, end in pairwise(PANELS):
        t = skipped + width * begin + MEDIUM.over(width * (end - begin))
        weight = np.exp(np.where(z <= 0, t * z - t * t / 2, -np.square(z - t) / 2))
        value = function(t, z, *parameters)
        once = weight * value
        first += width * (end - begin) * MEDIUM.mean(once)
        second += width * (end - begin) * MEDIUM.mean(once * value)
    return peak * first, peak * second
