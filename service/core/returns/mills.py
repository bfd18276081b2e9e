"""Mills' ratio and the partial moments of the standard normal law, each to full relative accuracy."""

import numpy as np
from scipy.special import erfcx, ndtr

from service.core.arrays import Numbers

ROOT_HALF = 0.70710678118654752440
SQRT_2PI = 2.50662827463100050242
SQRT_HALF_PI = 1.25331413731550025121
FRACTION_FROM = 1.5
FRACTION_DEPTH = 120


def normal_density(z: Numbers) -> Numbers:
    """Density of the standard normal law."""
    return np.exp(-z * z / 2) / SQRT_2PI


def mills_ratio(x: Numbers) -> Numbers:
    """P(Z > x) / density(x), Z standard normal; overflows to infinity below -38."""
    return SQRT_HALF_PI * erfcx(x * ROOT_HALF)


def normal_gaps(z: Numbers) -> tuple[Numbers, Numbers]:
    """E[max(z - Z, 0)] and E[max(z - Z, 0)^2], Z standard normal, for z <= 0.

    Near the centre from the closed forms; from x = -z = 1.5 on those cancel like x^2 and x^4, so there the moments
    I_n = integral of t^n/n! exp(-xt - t^2/2) come from Mills' ratio I_0 and the continued fraction
    I_n/I_(n-1) = 1/(x + (n+1) I_(n+1)/I_n), whose terms are all positive. Error 5e-15 relative (mpmath), any z.
    """
    x = np.asarray(-z)
    near = np.minimum(x, FRACTION_FROM)
    ratio = mills_ratio(near)
    first, second = np.asarray(1 - near * ratio), np.asarray((1 + near * near) * ratio - near)
    far = np.asarray(x > FRACTION_FROM)
    if far.any():
        x_far = np.minimum(x[far], 1e100)
        step_1, step_2 = _moment_ratios(x_far)
        first[far] = mills_ratio(x_far) * step_1
        second[far] = 2 * first[far] * step_2
    density = normal_density(z)
    return density * first, density * second


def _moment_ratios(x: Numbers) -> tuple[Numbers, Numbers]:
    """I_1/I_0 and I_2/I_1 by the continued fraction, from its limit at great depth."""
    ratio = 2 / (x + np.sqrt(x * x + 4 * (FRACTION_DEPTH + 1)))
    for n in range(FRACTION_DEPTH, 2, -1):
        ratio = 1 / (x + n * ratio)
    return 1 / (x + 2 * ratio), ratio


def partial_moments(distance: Numbers, spread: Numbers, z: Numbers) -> tuple[Numbers, Numbers]:
    """E[max(t - R, 0)] and E[max(t - R, 0)^2] for R normal with this spread, distance = t - mean, z their score.

    Arrays of one shape. Above the centre every term is positive, and a spread of 0 with z = +-inf is a point mass.
    """
    above = z > 0
    p, density = ndtr(z), normal_density(z)
    upper_1 = distance * p + spread * density
    upper_2 = (distance * distance + spread * spread) * p + distance * (spread * density)
    lower_1, lower_2 = normal_gaps(np.minimum(z, 0.0))
    return np.where(above, upper_1, spread * lower_1), np.where(above, upper_2, spread * spread * lower_2)
