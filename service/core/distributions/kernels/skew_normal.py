"""Tails, mode and entropy of the standard skew normal law for shape >= 0."""

import numpy as np
from scipy.special import erf, log_ndtr, ndtr, owens_t

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.elementary import HALF_LOG_2PI, LOG_PI
from service.core.distributions.kernels.logarithms import LOG_HALF, log_complement
from service.core.distributions.kernels.quadrature import FINE, MEDIUM

BLOCK = 2048


def log_skew_density(z: Numbers, a: Numbers) -> Numbers:
    """Logarithm of 2 phi(z) Phi(a z). Error eps (3 + |value|)."""
    value: Numbers = -LOG_HALF - z * z / 2 - HALF_LOG_2PI + log_ndtr(a * z)
    return value


def log_skew_tails(z: Numbers, a: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(Z <= z) and P(Z > z), a >= 0.

    Below 0 by quadrature of Owen's integral, with no difference of Owen's T. Above: Phi(-z) + 2 T(z, a), which are both
    positive (Owen 1956); beyond 30 twice Phi(-z) less the opposite tail. Error 1e-14, 2e-13 at 1e-300; a to 1e6.
    """
    distance = np.abs(z)
    opposite = _log_lower(distance, a)
    log_normal = log_ndtr(-distance)
    near = np.log(ndtr(-distance) + 2 * owens_t(distance, a))
    share = np.exp(np.minimum(opposite + LOG_HALF - log_normal, LOG_HALF))
    above = np.where(distance > 30, log_normal - LOG_HALF + np.log1p(-share), near)
    body = np.log(erf(distance * np.sqrt(0.5)) + np.exp(opposite))
    at_most = np.where(above < -1, log_complement(above), body)
    return (
        np.where(z < 0, opposite, at_most)[()],
        np.where(z < 0, log_complement(opposite), above)[()],
    )


def _log_lower(h: Numbers, a: Numbers) -> Numbers:
    """Log P(Z <= -h), h >= 0; in blocks that a processor's cache holds."""
    shape, (h, a) = flat(h, a)
    near = h * np.maximum(1, a) <= 0.5
    value = np.empty_like(h)
    for form, chosen in ((_from_median, near), (_far_out, ~near)):
        every = np.flatnonzero(chosen)
        for first in range(0, every.size, BLOCK):
            i = every[first : first + BLOCK]
            value[i] = form(h[i], a[i])
    return value.reshape(shape)[()]


def _far_out(h: Numbers, a: Numbers) -> Numbers:
    """1/pi times the integral of exp(-h^2 (1 + t^2)/2)/(1 + t^2) over t = sinh w from a on.

    Scaled to 1 at the lower end, 64 points up to where the exponent has grown by 42, an end in closed form.
    """
    hypotenuse, growth = np.sqrt(1 + a * a), 84 / (h * h)
    end_sinh = np.sqrt(a * a + growth)
    width = np.minimum(np.arcsinh(growth / (end_sinh * hypotenuse + a * np.sqrt(1 + end_sinh * end_sinh))), 40)
    r = FINE.over(width)
    sinh, cosh = np.sinh(r), np.cosh(r)
    exponent = 0.5 * h * h * sinh * (sinh * (1 + 2 * a * a) + cosh * 2 * a * hypotenuse)
    integral = width * FINE.mean(np.exp(-exponent) / (cosh * hypotenuse + sinh * a))
    value: Numbers = -0.5 * h * h * (1 + a * a) + np.log(integral) - LOG_PI
    return value


def _from_median(h: Numbers, a: Numbers) -> Numbers:
    """P(Z <= 0) = atan(1/a)/pi less the integral of the density from -h to 0, for h max(1, a) <= 1/2."""
    u = MEDIUM.over(h)
    inner = h * MEDIUM.mean(np.exp(-u * u / 2) * ndtr(-a * u)) * np.sqrt(2 / np.pi)
    value: Numbers = np.log(np.arctan2(1, a) / np.pi - inner)
    return value


def skew_mode(a: Numbers) -> Numbers:
    """Where the density is greatest, a >= 0: the root of a phi(a z)/Phi(a z) = z in [0, 1], halved 60 times."""
    low, high = np.zeros_like(a), np.ones_like(a)
    for _ in range(60):
        middle = 0.5 * (low + high)
        hazard = np.exp(-0.5 * np.square(a * middle) - HALF_LOG_2PI - log_ndtr(a * middle))
        rising = a * hazard > middle
        low, high = np.where(rising, middle, low), np.where(rising, high, middle)
    return np.where(a > 0, 0.5 * (low + high), 0)[()]


EDGES = np.concatenate([[0.0], 12 * 4.0 ** -np.arange(13.0, -1, -1)])


def skew_entropy(a: Numbers) -> Numbers:
    """Entropy in nats, a >= 0: that of the normal law less E[log 2 Phi(a Z)].

    36 points on each of 28 panels that shrink towards 0, where the density bends within 1/a. Error 1e-13.
    """
    shape, (flat_a,) = flat(a)
    edges = np.concatenate([-EDGES[:0:-1], EDGES])
    width = np.diff(edges)
    z = (edges[:-1] + MEDIUM.over(width)).ravel()[:, None]
    weights = (MEDIUM.weights[:, None] * width).ravel()
    gain = np.empty_like(flat_a)
    for first in range(0, flat_a.size, BLOCK):
        log_phi = log_ndtr(flat_a[first : first + BLOCK] * z) - LOG_HALF
        density = np.exp(-z * z / 2 - HALF_LOG_2PI + log_phi)
        gain[first : first + BLOCK] = weights @ np.where(density > 0, density * log_phi, 0)
    return (HALF_LOG_2PI + 0.5 - gain).reshape(shape)[()]
