"""Quantile of the gamma law in either tail."""

import numpy as np
from scipy.special import ndtri_exp

from service.core.arrays import Numbers, Truths, flat
from service.core.distributions.kernels.incomplete_gamma import log_gamma_density, log_gamma_tails
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.distributions.kernels.saddle_point import log_gamma_1p

LEAST_LOG, GREATEST_LOG = -745.0, 709.0


def gamma_quantile(a: Numbers, tail: Numbers, lower: Truths) -> Numbers:
    """Give x with P(a, x) = tail (`lower`) or Q(a, x) = tail, for 0 < tail <= 1/2.

    Newton on the log tail in log x, in which both tails are log-concave; a last step multiplies x itself. Where
    P = x^a/Gamma(a + 1) to the last digit, that power law. Error eps (1 + |log tail|/min(a, 1)).
    """
    shape, (a, tail, is_lower) = flat(a, tail, lower)
    target = np.log(tail)
    below = is_lower > 0
    log_at_most = np.where(below, target, log_complement(target))
    power = (log_at_most + log_gamma_1p(a)) / a
    value = np.exp(np.minimum(power, 0.0))
    start = _start(a, target, below, power)
    for side in (True, False):
        i = np.flatnonzero((below == side) & (power >= -40))
        if i.size:
            value[i] = _by_newton(a[i], target[i], start[i], side)
    return value.reshape(shape)[()]


def _start(a: Numbers, target: Numbers, below: Truths, power: Numbers) -> Numbers:
    """Logarithm of a rough quantile: Wilson & Hilferty's cube root near the middle, else the leading term of a tail."""
    z = ndtri_exp(target)
    root = 1 + np.where(below, z, -z) / (3 * np.sqrt(a)) - 1 / (9 * a)
    cube = np.where(root > 0.05, 3 * np.log(np.maximum(root, 1e-9)) + np.log(a), -np.inf)
    left = np.where((cube > -700) & (a > 0.5) & (target > -0.5 * a), cube, np.minimum(power, np.log(a + 1)))
    by_exponential = np.maximum(np.log(np.maximum(-target, 1e-3)) - 1, -5)
    right = np.where((a > 1) & np.isfinite(cube), np.maximum(cube, -50), by_exponential)
    return np.where(below, left, right)


def _by_newton(a: Numbers, target: Numbers, start: Numbers, lower: bool) -> Numbers:
    side = 0 if lower else 1

    def place(u: Numbers) -> Numbers:
        return np.exp(np.clip(u, LEAST_LOG, GREATEST_LOG))

    u = newton_on_log_tail(
        lambda u, a: log_gamma_tails(a, place(u))[side],
        lambda u, a: log_gamma_density(a, place(u)),
        target,
        start,
        a,
        rising=lower,
    )
    x = place(u)
    log_tail = log_gamma_tails(a, x)[side]
    step = (target - log_tail) * np.exp(log_tail - log_gamma_density(a, x)) * (1 if lower else -1)
    return np.where(np.abs(step) < 0.1, x * np.exp(step), x)
