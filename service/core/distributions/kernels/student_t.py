"""Tail, density and quantile of Student's t, as logarithms, for any degrees of freedom."""

import numpy as np
from scipy.special import betainc, digamma, erf, gammaln, ndtri_exp, stdtr, stdtrit

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.elementary import LOG_PI, log1p_minus_x
from service.core.distributions.kernels.logarithms import LOG_HALF
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.distributions.kernels.quadrature import MEDIUM
from service.core.distributions.kernels.saddle_point import stirling_error

TINY = 1e-290
FAR = 1e150
LARGEST = 1.7976931348623157e308
MOST_TERMS = 400


def log_gamma_ratio(v: Numbers) -> Numbers:
    """Log of Gamma((v + 1)/2)/(Gamma(v/2) sqrt(pi)), by Stirling errors from v = 24. Absolute error 2e-15."""
    a = v / 2
    large = 0.5 * np.log(a) + a * log1p_minus_x(0.5 / a) + stirling_error(a + 0.5) - stirling_error(a)
    return (np.where(v >= 24, large, gammaln(a + 0.5) - gammaln(a)) - LOG_PI / 2)[()]


def log_t_density(v: Numbers, t: Numbers) -> Numbers:
    """Logarithm of the density at t; t^2 may overflow. Error eps (4 + |value|)."""
    z = np.abs(t) / np.sqrt(v)
    log_spread = np.where(z > FAR, 2 * np.log(z), np.log1p(z * z))
    value: Numbers = log_gamma_ratio(v) - 0.5 * np.log(v) - (v + 1) / 2 * log_spread
    return value


def log_t_tail(v: Numbers, t: Numbers) -> Numbers:
    """Log of P(T > t) for t >= 0.

    scipy.special's stdtr while t <= 3 or v < 500, and the value is above 1e-290 (it fails beyond t = 1e154); else
    quadrature for v >= 10, the power series in v/(v + t^2) below. Error 1e-14 + eps |log|; v from 1e-3 to 1e15.
    """
    shape, (v, t) = flat(v, t)
    tail = stdtr(v, -t)
    value: Numbers = np.log(tail)
    hard = ~(tail > TINY) | ((v >= 500) & (t > 3)) | (t > FAR)
    by_quadrature = hard & (v >= 10) & (t < FAR)
    i = np.flatnonzero(by_quadrature)
    if i.size:
        value[i] = _log_quadrature(v[i], t[i])
    i = np.flatnonzero(hard & ~by_quadrature)
    if i.size:
        value[i] = _log_series(v[i], t[i])
    return value.reshape(shape)[()]


def _log_quadrature(v: Numbers, t: Numbers) -> Numbers:
    """Log tail for v >= 10: with t = sqrt(v) sinh s the density is c cosh(s)^-v, log-concave in s.

    The tail is the density times the integral of exp(-g(r)), g = v log1p(2 sinh^2(r/2) + tanh(s) sinh r), cut where
    g reaches 40; 36 points.
    """
    tanh = t / np.hypot(np.sqrt(v), t)

    def exponent(r: Numbers) -> Numbers:
        half = np.sinh(r / 2)
        return v * np.log1p(2 * half * half + tanh * np.sinh(r))

    end = 80 / (v * tanh + np.sqrt((v * tanh) ** 2 + 80 * v))
    for _ in range(3):
        small = 1e-6 * end
        end = end - (exponent(end) - 40) * small / (exponent(end + small) - exponent(end))
    integral = end * MEDIUM.mean(np.exp(-exponent(MEDIUM.over(end))))
    score = t / np.sqrt(v)
    value: Numbers = log_gamma_ratio(v) - v / 2 * np.log1p(score * score) + np.log(integral)
    return value


def _log_series(v: Numbers, t: Numbers) -> Numbers:
    """Log tail by the power series of I_w(v/2, 1/2) in w = v/(v + t^2), for small w; t^2 may overflow."""
    log_w = np.log(v) - 2 * np.log(t)
    log_w = log_w - np.log1p(np.exp(log_w))
    w = np.exp(log_w)
    a = v / 2
    total, term = np.ones_like(w), np.ones_like(w)
    k = 0
    while k < MOST_TERMS and (term > 1e-18).any():
        k += 1
        term = term * w * (k - 0.5) / k
        total = total + term * a / (a + k)
    value: Numbers = LOG_HALF + a * log_w + log_gamma_ratio(v) - np.log(a) + np.log(total)
    return value


def t_central(v: Numbers, t: Numbers) -> Numbers:
    """P(|T| < t) for t >= 0 without cancellation at small t: betainc, erf beyond v = 1e14, the tail for t^2 > v."""
    square = t * t
    moderate = np.minimum(v, 1e14)
    near = np.where(v > 1e14, erf(t * np.sqrt(0.5)), betainc(0.5, moderate / 2, square / (moderate + square)))
    return np.where((square > v) & (v <= 1e14), -np.expm1(log_t_tail(v, t) - LOG_HALF), near)[()]


def t_quantile(v: Numbers, tail: Numbers) -> Numbers:
    """Give t >= 0 with P(T > t) = tail, for 0 < tail <= 1/2; inf beyond the largest double.

    Newton in log t: on the log tail, or near the median (tail above 0.3) on the log of the central probability, which
    keeps the digits of a small t. Error 1e-15 in the body, eps |log tail|/min(v, 1) far out.
    """
    shape, (v, tail) = flat(v, tail)
    target = np.log(tail)
    value = np.zeros_like(v)
    middle = tail > 0.3
    beyond = ~middle & (log_t_tail(v, np.full_like(v, LARGEST)) > target)
    value[beyond] = np.inf
    i = np.flatnonzero(~middle & ~beyond)
    if i.size:
        value[i] = _outer_quantile(v[i], tail[i], target[i])
    i = np.flatnonzero(middle & (tail < 0.5))
    if i.size:
        value[i] = _inner_quantile(v[i], 0.5 - tail[i])
    return value.reshape(shape)[()]


def _log_density_of_log(u: Numbers, v: Numbers) -> Numbers:
    return log_t_density(v, np.exp(u)) + u


def _outer_quantile(v: Numbers, tail: Numbers, target: Numbers) -> Numbers:
    """Start from stdtrit where it can be trusted, else from the normal quantile (large v) or the power law."""
    by_scipy = -stdtrit(v, tail)
    power = (log_gamma_ratio(v) - np.log(v) + (v / 2) * np.log(v) - target) / v
    start = np.where(v > 200, np.log(-ndtri_exp(target)), power)
    start = np.where(np.isfinite(by_scipy) & (by_scipy > 0) & (tail > 1e-80), np.log(by_scipy), start)
    u = newton_on_log_tail(
        lambda u, v: log_t_tail(v, np.exp(u)),
        _log_density_of_log,
        target,
        np.clip(start, -740, 709),
        v,
        rising=False,
    )
    t = np.exp(u)
    # one more step in t itself, which log t is too coarse for
    log_value = log_t_tail(v, t)
    step = (log_value - target) * np.exp(log_value - _log_density_of_log(np.log(t), v))
    return np.where(np.abs(step) < 0.1, t * np.exp(step), t)


def _inner_quantile(v: Numbers, half_central: Numbers) -> Numbers:
    start = np.log(half_central) - (log_gamma_ratio(v) - 0.5 * np.log(v))
    u = newton_on_log_tail(
        lambda u, v: np.log(0.5 * t_central(v, np.exp(u))),
        _log_density_of_log,
        np.log(half_central),
        start,
        v,
        rising=True,
    )
    return np.exp(u)


ENTROPY_SERIES = (1 / 2, 1 / 8, -1 / 64, 1 / 128, -17 / 2048, 31 / 2048)
"""psi(a + 1/2) - psi(a) = sum of these over a, a^2, a^4, a^6, ... (derivative of the series of the gamma ratio)."""


def t_entropy(v: Numbers) -> Numbers:
    """Entropy of Student's t in nats: (v + 1)/2 (psi((v + 1)/2) - psi(v/2)) - log density at 0.

    The difference of digammas by its asymptotic series from v = 40. Error 1e-13 of max(1, entropy).
    """
    a = v / 2
    square = 1 / (a * a)
    series = square * 0
    for coefficient in ENTROPY_SERIES[:0:-1]:
        series = (series + coefficient) * square
    difference = np.where(v >= 40, ENTROPY_SERIES[0] / a + series, digamma(a + 0.5) - digamma(a))
    return ((v + 1) / 2 * difference - log_gamma_ratio(v) + 0.5 * np.log(v))[()]
