"""A return whose growth factor is lognormal."""

import numpy as np
from scipy.special import ndtr, ndtri

from service.core.arrays import Numbers, Truths, flat, number
from service.core.distributions.kernels.quadrature import FINE
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, Ordering, log_growth_factor, score
from service.core.returns.mills import mills_ratio, normal_density

LOG_COINCIDENCE = number(COINCIDENCE)
REACH = 9.0
"""Beyond so many standard deviations the normal law holds less than 1e-18."""
STEEPEST = 20.0
"""Greatest log range of the integrand over the nodes; beyond it the closed forms do not cancel."""
FARTHEST = 1e8
BLOCK = 500
"""So many at a time stay in the processor's cache."""
MILD = 0.02
"""Mills ratios at x and x + s differ enough for 14 digits where s is more than this share of x + s."""


class LognormalLaw(HorizonLaw):
    """log(1 + R) ~ N(log_mean, log_deviation^2), log_deviation >= 0.

    `moments`: E[R] and sd[R] where they are known better than these parameters give them.
    """

    numerical_error = 1e-14

    def __init__(
        self, log_mean: Numbers, log_deviation: Numbers, moments: tuple[Numbers, Numbers] | None = None
    ) -> None:
        self.log_mean: Numbers
        self.log_deviation: Numbers
        self.log_mean, self.log_deviation = np.broadcast_arrays(log_mean, log_deviation)
        self._mean, self._deviation = moments or growth_moments(
            self.log_mean + self.log_deviation**2 / 2, self.log_deviation**2
        )

    def _distance(self, threshold: Numbers) -> Numbers:
        return log_growth_factor(threshold) - self.log_mean

    def mean(self) -> Numbers:
        return self._mean

    def standard_deviation(self) -> Numbers:
        return self._deviation

    def probability_below(self, threshold: Numbers) -> Numbers:
        return ndtr(score(self._distance(threshold), self.log_deviation, LOG_COINCIDENCE))

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return ndtr(-score(-self._distance(threshold), self.log_deviation, LOG_COINCIDENCE))

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray((self.log_deviation == 0) | (threshold <= -1))

    def gaps(self, threshold: Numbers) -> Gaps:
        distance = self._distance(threshold)
        growth = np.maximum(1 + threshold, 0.0)
        first, second = relative_gaps(
            distance, self.log_deviation, score(distance, self.log_deviation, LOG_COINCIDENCE)
        )
        return Gaps(growth * first, growth * (growth * second))

    def quantile(self, probability: Numbers) -> Numbers:
        return np.expm1(self.log_mean + self.log_deviation * ndtri(probability))

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # the gap below the quantile, averaged over the tail, less the quantile: both right to the last digits
        z, deviation = np.broadcast_arrays(ndtri(probability), self.log_deviation)
        distance = deviation * z
        share: Numbers = np.asarray(1 - mills_ratio(deviation - z) / mills_ratio(-z))
        alike = np.asarray(deviation <= MILD * (np.maximum(-z, 0.0) + deviation))
        if alike.any():
            first, _ = relative_gaps(distance[alike], deviation[alike], z[alike])
            share[alike] = first / np.broadcast_to(probability, z.shape)[alike]
        loss: Numbers = np.exp(self.log_mean + distance) * share - np.expm1(self.log_mean + distance)
        return loss

    def log_growth(self) -> LogGrowth:
        return LogGrowth(self.log_mean, self.log_deviation)

    def total_loss_probability(self) -> Numbers:
        return np.zeros_like(self.log_mean)

    def ordering(self) -> Ordering:
        zero = np.zeros_like(self.log_mean)
        return Ordering("lognormal", zero, self.log_mean, self.log_deviation, self._mean + zero)


def growth_moments(log_of_mean: Numbers, log_variance: Numbers) -> tuple[Numbers, Numbers]:
    """E[G] - 1 and sd[G] of a lognormal G; either may overflow to infinity."""
    # exp(v/2) sqrt(1 - exp(-v)) is sqrt(exp(v) - 1), in one exponential with the mean: their product may be moderate
    deviation = np.exp(log_of_mean + log_variance / 2) * np.sqrt(-np.expm1(-log_variance))
    return np.expm1(log_of_mean), np.where(log_variance > 0, deviation, 0.0)


def relative_gaps(distance: Numbers, deviation: Numbers, z: Numbers) -> tuple[Numbers, Numbers]:
    """E[max(1 - G/K, 0)] and the mean of its square, G lognormal, distance = log K - E[log G], z its score.

    Both are integrals of density(t - z) (1 - exp(-deviation t))^j over t > 0, whose terms are all positive: 64-point
    quadrature, error 2e-14 relative (mpmath). Where the deviation is so large that the integrand bends too much, the
    closed forms with Phi, which cancel little there. A deviation of 0 with z = +-inf is a point mass.
    """
    shape, (ell, s, d) = flat(distance, deviation, z)
    d = np.maximum(d, -FARTHEST)
    steep = s * np.where(d > 0, d + REACH, _reach_below(d)) > STEEPEST
    steep &= d <= REACH
    first, second = np.empty(d.size), np.empty(d.size)
    if steep.any():
        first[steep], second[steep] = _closed_forms(s[steep], d[steep])
    smooth = np.flatnonzero(~steep)
    for start in range(0, smooth.size, BLOCK):
        i = smooth[start : start + BLOCK]
        first[i], second[i] = _by_quadrature(ell[i], s[i], d[i])
    return first.reshape(shape), second.reshape(shape)


def _reach_below(d: Numbers) -> Numbers:
    """Give the t > 0 at which exp(dt - t^2/2) has fallen to exp(-40), for d <= 0."""
    x = np.maximum(-d, 0.0)
    reach: Numbers = 80 / (x + np.sqrt(x * x + 80))
    return reach


def _by_quadrature(ell: Numbers, s: Numbers, d: Numbers) -> tuple[Numbers, Numbers]:
    below = d <= 0
    inner = np.minimum(d, REACH)
    width = np.where(below, _reach_below(d), inner + REACH)
    t = FINE.over(width)  # counted from 0, or from z - 9 where z is greater
    from_centre = t - inner
    weight = np.exp(np.where(below, t * d - t * t / 2, -from_centre * from_centre / 2))
    relative_gap = -np.expm1(-np.where(d > REACH, ell + s * from_centre, s * t))
    scale = width * normal_density(np.where(below, d, 0.0))
    once = weight * relative_gap
    return scale * FINE.mean(once), scale * FINE.mean(once * relative_gap)


def _closed_forms(s: Numbers, d: Numbers) -> tuple[Numbers, Numbers]:
    whole, once, twice = (_partial_moment(k * s, d) for k in range(3))
    return whole - once, whole - 2 * once + twice


def _partial_moment(shift: Numbers, d: Numbers) -> Numbers:
    """E[(G/K)^k; G < K] with shift = k deviation: density(d) times Mills' ratio, or with Phi where that overflows."""
    beyond = shift < d
    by_mills: Numbers = normal_density(d) * mills_ratio(np.where(beyond, 0.0, shift - d))
    by_phi: Numbers = np.exp(np.minimum(shift * (shift / 2 - d), 0.0)) * ndtr(d - shift)
    return np.where(beyond, by_phi, by_mills)
