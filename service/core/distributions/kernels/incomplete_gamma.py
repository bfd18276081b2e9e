"""Both tails of the gamma law, as logarithms, for any shape."""

import numpy as np
from scipy.special import gammainc, gammaincc, gammaln

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.elementary import LOG_2PI, log1p_minus_x
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.saddle_point import deviance, digamma_error, stirling_error
from service.core.distributions.kernels.temme import log_gamma_tails_uniform

UNIFORM_FROM = 100.0
TINY = 1e-290
MOST_TERMS = 5000


def log_gamma_density(a: Numbers, x: Numbers) -> Numbers:
    """Logarithm of x^a exp(-x)/Gamma(a), the density of log X, for a, x > 0.

    Saddle-point form for a >= 1, plainly below. Error eps (3 + |value|).
    """
    saddle = 0.5 * (np.log(a) - LOG_2PI) - stirling_error(a) - deviance(a, x - a, x)
    plain = a * np.log(x) - x - gammaln(a + 1) + np.log(a)
    return np.where(a >= 1, saddle, plain)[()]


def log_gamma_tails(a: Numbers, x: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(a, x) and Q(a, x), the regularised incomplete gamma functions, for a > 0, x >= 0.

    scipy.special's gammainc and gammaincc for a < 100 while above 1e-290; from 100 Temme's uniform expansion near the
    mean (|eta| < 1); elsewhere the power series below the mean and Legendre's continued fraction above it, times the
    saddle-point density. Error 1e-14 in the body, 5e-13 at 1e-300; a from 1e-6 to 1e12 tested against mpmath.
    """
    shape, (a, x) = flat(a, x)
    lower, upper = _by_scipy(a, x)
    inside = (x > 0) & np.isfinite(x)
    hard = inside & ((a >= UNIFORM_FROM) | ~((lower > np.log(TINY)) & (upper > np.log(TINY))))
    square = np.where(hard, -2 * log1p_minus_x((x - a) / a), np.inf)
    uniform = hard & (a >= UNIFORM_FROM) & (square < 1)
    i = np.flatnonzero(uniform)
    if i.size:
        lower[i], upper[i] = log_gamma_tails_uniform(a[i], x[i], square[i])
    i = np.flatnonzero(hard & ~uniform & (x < a + 1))
    if i.size:
        lower[i] = log_gamma_density(a[i], x[i]) + _log_series(a[i], x[i])
        upper[i] = log_complement(lower[i])
    i = np.flatnonzero(hard & ~uniform & (x >= a + 1))
    if i.size:
        upper[i] = log_gamma_density(a[i], x[i]) + _log_fraction(a[i], x[i])
        lower[i] = log_complement(upper[i])
    return lower.reshape(shape)[()], upper.reshape(shape)[()]


def _by_scipy(a: Numbers, x: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of both tails, the larger one from the smaller; right for moderate a alone, and at 0 and infinity."""
    p, q = gammainc(a, x), gammaincc(a, x)
    return np.where(q < 0.3, np.log1p(-q), np.log(p)), np.where(p < 0.3, np.log1p(-p), np.log(q))


def _log_series(a: Numbers, x: Numbers) -> Numbers:
    """Logarithm of P over the density of log X: sum of x^n/(a (a+1) ... (a+n)), for x < a + 1."""
    term = 1 / a
    total = term.copy()
    n = 0
    while n < MOST_TERMS and (term > total * 1e-17).any():
        n += 1
        term = term * (x / (a + n))
        total += term
    return np.log(total)


def _log_fraction(a: Numbers, x: Numbers) -> Numbers:
    """Logarithm of Q over the density of log X by Legendre's continued fraction (modified Lentz), for x > a."""
    b = x + 1 - a
    c = np.full_like(b, 1e300)
    d = 1 / b
    value = d.copy()
    change = np.full_like(b, 2.0)
    n = 0
    while n < MOST_TERMS and (np.abs(change - 1) > 3e-16).any():
        n += 1
        numerator = -n * (n - a)
        b = b + 2
        d = 1 / _not_zero(numerator * d + b)
        c = _not_zero(b + numerator / c)
        change = c * d
        value *= change
    return np.log(value)


def _not_zero(value: Numbers) -> Numbers:
    return np.where(np.abs(value) < 1e-300, 1e-300, value)


def gamma_entropy(a: Numbers) -> Numbers:
    """Entropy of the gamma law of shape a and scale 1, in nats: a + log Gamma(a) + (1 - a) psi(a).

    Written by the errors of Stirling's formulas, as the terms themselves cancel for large a. Error 4 eps.
    """
    return 0.5 * (np.log(a) + LOG_2PI + 1) - 0.5 / a + stirling_error(a) + (a - 1) * digamma_error(a)
