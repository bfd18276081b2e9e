"""Saddle-point forms of masses and densities (Loader 2000), in which no large terms cancel."""

import numpy as np
from scipy.special import digamma, gammaln

from service.core.arrays import Numbers
from service.core.distributions.kernels.elementary import LOG_2PI, log1p_minus_x, two_product

STIRLING_SERIES = (1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360, 1 / 156, -3617 / 122400)
"""Coefficients of 1/z, 1/z^3, ... (Abramowitz & Stegun 6.1.40)."""
SERIES_FROM = 12.0


def stirling_error(z: Numbers) -> Numbers:
    """Give log Gamma(z) - [(z - 1/2) log z - z + log(2 pi)/2] for z > 0.

    Eight terms of Stirling's series from 12, plainly by log Gamma(z + 1) below. Error 1e-16 from 12, 2e-15 below.
    """
    large = z >= SERIES_FROM
    w = np.where(large, z, SERIES_FROM)
    inverse_square = 1 / (w * w)
    total = inverse_square * 0 + STIRLING_SERIES[-1]
    for coefficient in STIRLING_SERIES[-2::-1]:
        total = total * inverse_square + coefficient
    if large.all():
        return (total / w)[()]
    v = np.where(large, 1.0, z)
    direct = gammaln(v + 1) - (v + 0.5) * np.log(v) + v - LOG_2PI / 2
    return np.where(large, total / w, direct)[()]


def deviance(x: Numbers, difference: Numbers, m: Numbers) -> Numbers:
    """Give x log(x/m) + m - x, which is -x log1p_minus_x(difference/x), for x >= 0 and m = x + difference.

    `difference` must come without cancellation; m itself serves where it is below x/2. x = 0 gives m.
    Error 3 eps and that of the difference.
    """
    near = -x * log1p_minus_x(difference / np.where(x > 0, x, 1.0))
    far = m < 0.5 * x
    value = np.where(far, x * np.log(x / m) + difference, near)
    return np.where(x > 0, value, difference)[()]


def log_poisson_mass(k: Numbers, rate: Numbers) -> Numbers:
    """Logarithm of rate^k exp(-rate)/k! for k >= 0, rate > 0. Error eps (3 + |value|)."""
    positive = np.maximum(k, 0.5)
    value = -stirling_error(positive) - deviance(k, rate - k, rate) - 0.5 * (np.log(positive) + LOG_2PI)
    return np.where(k > 0, value, -rate)[()]


def log_binomial_mass(k: Numbers, n: Numbers, p: Numbers, q: Numbers) -> Numbers:
    """Logarithm of C(n, k) p^k q^(n - k) for 0 <= k <= n, q = 1 - p; k - n p by an exact product.

    k and n need not be whole. Error eps (3 + |value|), n to 1e12.
    """
    mirrored = p > q
    s = np.where(mirrored, q, p)
    hits = np.where(mirrored, n - k, k)
    misses = n - hits
    high, low = two_product(n, s)
    excess = (hits - high) - low
    j, i = np.maximum(hits, 0.5), np.maximum(misses, 0.5)
    value = (
        stirling_error(np.maximum(n, 0.5))
        - stirling_error(j)
        - stirling_error(i)
        - deviance(hits, -excess, n * s)
        - deviance(misses, excess, n - n * s)
        + 0.5 * (np.log(n) - np.log(j) - np.log(i) - LOG_2PI)
    )
    # nothing hit: q^n; nothing missed: p^n, which is 1 for n = 0
    value = np.where(misses == 0, n * np.log(np.where(n > 0, s, 1)), value)
    return np.where(hits == 0, n * np.log1p(-s), value)[()]


DIGAMMA_SERIES = (1 / 12, -1 / 120, 1 / 252, -1 / 240, 1 / 132, -691 / 32760, 1 / 12, -3617 / 8160)
"""Coefficients of 1/z^2, 1/z^4, ... (Abramowitz & Stegun 6.3.18)."""


def digamma_error(z: Numbers) -> Numbers:
    """Give log z - 1/(2 z) - psi(z) for z > 0: eight terms of its series from 12, plainly below.

    Entropies written with it and with `stirling_error` have no large terms that cancel. Absolute error 1e-17 from 12,
    eps (1 + 1/z) below.
    """
    square = 1 / np.square(np.maximum(z, SERIES_FROM))
    total = square * 0
    for coefficient in DIGAMMA_SERIES[::-1]:
        total = (total + coefficient) * square
    return np.where(z >= SERIES_FROM, total, np.log(z) - 0.5 / z - digamma(z))[()]


LOG_GAMMA_SERIES = (
    -0.57721566490153286061,
    0.82246703342411321824,
    -0.40068563438653142847,
    0.27058080842778454788,
    -0.20738555102867398527,
    0.16955717699740818995,
    -0.14404989676884611812,
    0.12550966952474304242,
)
"""-Euler's constant, then zeta(k)/k with falling signs (Abramowitz & Stegun 6.1.33)."""


def log_gamma_1p(a: Numbers) -> Numbers:
    """Log of Gamma(1 + a) for a > 0, of which 1 + a would lose the digits of a small a. Relative error 1e-15.

    Eight terms of its series below 0.01, log Gamma beyond.
    """
    small = np.minimum(a, 0.01)
    total = small * 0
    for coefficient in LOG_GAMMA_SERIES[::-1]:
        total = (total + coefficient) * small
    return np.where(a < 0.01, total, gammaln(1 + a))[()]
