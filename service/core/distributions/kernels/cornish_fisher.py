"""The Cornish-Fisher transformation of a standard normal Z: w(Z) = c1 H1 + c2 H2 + c3 H3 in Hermite polynomials."""

from typing import NamedTuple

import numpy as np

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.elementary import HALF_LOG_2PI
from service.core.distributions.kernels.quadrature import MEDIUM

BLOCK = 2048
HALVINGS = 4.0 ** -np.arange(26.0)


class Expansion(NamedTuple):
    """Coefficients of H1 = z, H2 = z^2 - 1, H3 = z^3 - 3 z; the transformation has mean 0."""

    c1: Numbers
    c2: Numbers
    c3: Numbers

    @classmethod
    def of(cls, skewness: Numbers, excess_kurtosis: Numbers) -> "Expansion":
        """Z + (z^2 - 1) S/6 + (z^3 - 3 z) K/24 - (2 z^3 - 5 z) S^2/36, gathered (Cornish & Fisher 1937)."""
        square = skewness * skewness
        return cls(1 - square / 36, skewness / 6, excess_kurtosis / 24 - square / 18)

    def value(self, z: Numbers) -> Numbers:
        """w(z)."""
        return ((self.c3 * z + self.c2) * z + (self.c1 - 3 * self.c3)) * z - self.c2

    def slope(self, z: Numbers) -> Numbers:
        """w'(z), by its distance from the point where it is least, so that it does not cancel there."""
        least_at = np.where(self.c3 > 0, -self.c2 / (3 * self.c3), 0)
        least = self.c1 - 3 * self.c3 + np.where(self.c3 > 0, self.c2 * least_at, 2 * self.c2 * z)
        return np.maximum(3 * self.c3 * np.square(z - least_at) + least, 0)

    def bend(self, z: Numbers) -> Numbers:
        """w''(z)."""
        return 6 * self.c3 * z + 2 * self.c2


def inverse(y: Numbers, w: Expansion) -> Numbers:
    """The one z with w(z) = y, for a monotone expansion.

    Cardano's formula in the form without a difference of roots, then four steps of Newton's; near c3 = 0 these start
    from the straight line. Error 4 eps over the condition of the question.
    """
    cubic = w.c3 > 1e-24
    lead = np.where(cubic, w.c3, 1.0)
    shift = w.c2 / (3 * lead)
    third = (w.c1 - 3 * w.c3) / (3 * lead) - shift * shift
    half = (w.value(-shift) - y) / (2 * lead)
    size = np.cbrt(np.abs(half) + np.sqrt(half * half + np.maximum(third, 0) ** 3))
    total = size * size + third + np.square(third / size)
    root = np.where(size > 0, -2 * half / total, 0) - shift
    z = np.where(cubic, root, y / w.c1)
    for _ in range(4):
        step = (w.value(z) - y) / w.slope(z)
        z = np.where(np.abs(step) <= 0.1 * (1 + np.abs(z)), z - step, z)
    return z[()]


def shape_moments(w: Expansion) -> tuple[Numbers, Numbers, Numbers]:
    """Spread, skewness and excess kurtosis of w(Z), by the moments of products of Hermite polynomials. Error 8 eps."""
    a, b, c = w
    a2, b2, c2 = a * a, b * b, c * c
    variance = a2 + 2 * b2 + 6 * c2
    third = b * (6 * a2 + 8 * b2 + 36 * a * c + 108 * c2)
    fourth = 24 * a * c * (a2 + 9 * a * c + 24 * b2 + 54 * c2) + b2 * (48 * a2 + 48 * b2 + 2160 * c2) + 3240 * c2 * c2
    return np.sqrt(variance), third / variance**1.5, fourth / variance**2


def log_density(z: Numbers, w: Expansion) -> Numbers:
    """Logarithm of the density of w(Z) at w(z)."""
    return -z * z / 2 - HALF_LOG_2PI - np.log(w.slope(z))


def most_likely_score(w: Expansion) -> Numbers:
    """Z at which the density of w(Z) is greatest.

    The best of a grid and of the point where the slope is least; around it, 60 halvings for the root of z + w''/w'.
    """
    least_at = np.where(w.c3 > 0, -w.c2 / (3 * w.c3), 0)
    grid = np.linspace(-8, 8, 81).reshape((-1,) + (1,) * np.ndim(least_at)) + 0 * least_at
    candidates = np.concatenate([grid, least_at[None]])
    best = np.take_along_axis(candidates, np.argmax(log_density(candidates, w), axis=0)[None], 0)[0]
    low, high = best - 0.2, best + 0.2
    for _ in range(60):
        middle = 0.5 * (low + high)
        rising = middle * w.slope(middle) + w.bend(middle) < 0
        low, high = np.where(rising, middle, low), np.where(rising, high, middle)
    return np.where(w.slope(least_at) > 0, 0.5 * (low + high), least_at)[()]


def entropy(w: Expansion) -> Numbers:
    """Entropy of w(Z) in nats: that of Z and E[log w'(Z)], 36 points on each panel.

    The panels shrink towards the point where the slope is least, as its logarithm may have a pole there. Error 1e-13.
    """
    shape, coefficients = flat(*w)
    gain = np.empty_like(coefficients[0])
    for first in range(0, gain.size, BLOCK):
        part = Expansion(*(c[first : first + BLOCK] for c in coefficients))
        least_at = np.clip(np.where(part.c3 > 0, -part.c2 / (3 * part.c3), 0), -12, 12)
        offsets = 24 * np.concatenate([-HALVINGS, [0.0], HALVINGS[::-1]])
        edges = np.clip(least_at + offsets[:, None], -12, 12)
        width = np.diff(edges, axis=0)
        z = edges[:-1] + MEDIUM.over(width)
        logs = np.log(part.slope(z)) * np.exp(-z * z / 2 - HALF_LOG_2PI)
        gain[first : first + BLOCK] = (width * MEDIUM.mean(np.where(width > 0, logs, 0))).sum(axis=0)
    return (HALF_LOG_2PI + 0.5 + gain).reshape(shape)[()]
