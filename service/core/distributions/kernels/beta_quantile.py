"""Quantile of the beta law in either tail, with its distance from 1."""

import numpy as np
from scipy.special import betainccinv, betaincinv, expit, ndtri_exp

from service.core.arrays import Numbers, Truths, flat
from service.core.distributions.kernels.incomplete_beta import (
    beta_offset,
    log_a_beta,
    log_beta_density,
    log_beta_tails,
)
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.newton import newton_on_log_tail


def beta_quantile(a: Numbers, b: Numbers, tail: Numbers, lower: Truths) -> tuple[Numbers, Numbers]:
    """Give x and 1 - x with I_x(a, b) = tail (`lower`) or its complement equal to it, for 0 < tail <= 1/2.

    Everything as a lower tail; Newton on its logarithm, concave in u = log(x/(1 - x)), and a last step on the ratio
    x/(1 - x) itself. Where I_x = x^a/(a B(a, b)) to the last digit, that power law; so at the other end. Error
    eps (1 + |log tail|/min(a, b, 1)).
    """
    shape, (a, b, tail, is_lower) = flat(a, b, tail, lower)
    first = is_lower > 0
    p, q = np.where(first, a, b), np.where(first, b, a)
    target = np.log(tail)
    power = (target + log_a_beta(p, q)) / p
    far_power = (log_complement(target) + log_a_beta(q, p)) / q
    near_0, near_1 = power + np.log1p(q) < -40, far_power + np.log1p(p) < -40
    x = np.where(near_0, np.exp(np.minimum(power, 0)), -np.expm1(np.minimum(far_power, 0)))
    y = np.where(near_0, -np.expm1(np.minimum(power, 0)), np.exp(np.minimum(far_power, 0)))
    i = np.flatnonzero(~near_0 & ~near_1)
    if i.size:
        x[i], y[i] = _by_newton(p[i], q[i], target[i], power[i])
    return np.where(first, x, y).reshape(shape)[()], np.where(first, y, x).reshape(shape)[()]


def _log_tail(a: Numbers, b: Numbers, x: Numbers, y: Numbers) -> Numbers:
    return log_beta_tails(a, b, x, y, beta_offset(a, b, x, y))[0]


def _log_density(a: Numbers, b: Numbers, x: Numbers, y: Numbers) -> Numbers:
    return log_beta_density(a, b, x, y, beta_offset(a, b, x, y))


def _both_sides(u: Numbers) -> tuple[Numbers, Numbers]:
    """X and y = 1 - x with log(x/y) = u."""
    return expit(u), expit(-u)


def _by_newton(a: Numbers, b: Numbers, target: Numbers, power: Numbers) -> tuple[Numbers, Numbers]:
    middle = np.log(a) - np.log(b)
    spread = np.sqrt(1 / a + 1 / b)
    z = ndtri_exp(target)
    start = np.where((np.minimum(a, b) > 5) & (-spread * z < 3), middle + spread * z, np.minimum(power, middle))
    rough = np.log(betaincinv(a, b, np.exp(target))) - np.log(betainccinv(b, a, np.exp(target)))
    # scipy's inverse saves most steps where it can be trusted
    start = np.where(np.isfinite(rough) & (target > -150) & (np.maximum(a, b) < 1e4), rough, start)
    u = newton_on_log_tail(
        lambda u, a, b: _log_tail(a, b, *_both_sides(u)),
        lambda u, a, b: _log_density(a, b, *_both_sides(u)),
        target,
        np.clip(start, -745, 745),
        a,
        b,
        rising=True,
    )
    x, y = _both_sides(u)
    log_tail = _log_tail(a, b, x, y)
    step = (target - log_tail) * np.exp(log_tail - _log_density(a, b, x, y))
    stretch = np.exp(np.where(np.abs(step) < 0.1, step, 0))
    total = y + x * stretch
    return x * stretch / total, y / total
