"""The normal law between two ends, however far out and however close together."""

from typing import NamedTuple

import numpy as np
from scipy.special import erf, erfcx

from service.core.arrays import Numbers, flat
from service.core.distributions.kernels.elementary import HALF_LOG_2PI
from service.core.distributions.kernels.quadrature import MEDIUM

ROOT_HALF = np.sqrt(0.5)


def log_scaled_mass(a: Numbers, d: Numbers) -> Numbers:
    """Logarithm of (Phi(a + d) - Phi(a)) exp(peak^2/2), d >= 0 given exactly, peak the point of [a, a + d] nearest 0.

    Ends of opposite signs: a sum of two erf; of the same sign: a difference of two erfcx where d max(1, |a|) > 1, else
    the integral of exp(-a t - t^2/2) by 36 points. Scaled so, laws far out in a tail keep their digits. Error 4 eps.
    """
    shape, (a, d) = flat(a, d)
    b = a + d
    mirrored = a + b < 0
    near, far = np.where(mirrored, -b, a), np.where(mirrored, -a, b)
    across = np.log(0.5 * (erf(far * ROOT_HALF) - erf(near * ROOT_HALF)))
    fall = np.exp(np.minimum(-d * (near + d / 2), 0))
    apart = np.log(0.5 * (erfcx(near * ROOT_HALF) - fall * erfcx(far * ROOT_HALF)))
    value: Numbers = np.where(near < 0, across, apart)
    i = np.flatnonzero(d * np.maximum(1, np.abs(near)) <= 1)
    if i.size:
        value[i] = _log_narrow(near[i], d[i])
    return value.reshape(shape)[()]


def _log_narrow(near: Numbers, d: Numbers) -> Numbers:
    t = MEDIUM.over(d)
    value = np.log(d * MEDIUM.mean(np.exp(-t * (near + t / 2)))) - HALF_LOG_2PI
    # an interval across 0 has its peak there, the integral is scaled to its end
    return value - np.square(np.minimum(near, 0)) / 2


class Cut(NamedTuple):
    """The normal law cut to [a, a + d]: a, d and b = a + d in standard deviations of the parent."""

    a: Numbers
    d: Numbers
    b: Numbers

    @property
    def peak(self) -> Numbers:
        """The point nearest 0."""
        nearest: Numbers = np.clip(0, self.a, self.b)
        return nearest


def log_lower_share(distance: Numbers, cut: Cut) -> Numbers:
    """Logarithm of the share of the cut law's mass within `distance` of its lower end. Error 4 eps (1 + |log|)."""
    part = Cut(cut.a, distance, cut.a + distance)
    # (peak of the part)^2 - (peak of the whole)^2, from exact differences where both lie left of 0
    difference = np.where(cut.b < 0, distance - cut.d, part.peak - cut.peak)
    exponent = difference * (part.peak + cut.peak) / 2
    return log_scaled_mass(cut.a, distance) - log_scaled_mass(cut.a, cut.d) - exponent


def log_cut_density(offset: Numbers, cut: Cut) -> Numbers:
    """Logarithm of the cut law's density, at `offset` from its peak. Error 4 eps, eps |value| far out."""
    return -offset * (offset / 2 + cut.peak) - HALF_LOG_2PI - log_scaled_mass(cut.a, cut.d)
