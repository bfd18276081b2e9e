"""A return whose log growth is a scaled Student t."""

from itertools import pairwise

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, Truths, flat, number
from service.core.distributions.kernels.quadrature import MEDIUM
from service.core.distributions.kernels.student_t import log_t_density
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, Ordering, log_growth_factor, score
from service.core.returns.laws.student_t import deviation_of_t, t_at, t_at_most

LOG_COINCIDENCE = number(COINCIDENCE)
FARTHEST = 1e100
DEPTH = 60.0
"""The density is followed down to exp(-60) of its greatest value below the threshold."""
PANELS = np.array([0, 0.002, 0.01, 0.04, 0.1, 0.2, 0.35, 0.5, 0.65, 0.82, 1])
BLOCK = 500


class ExponentialTLaw(HorizonLaw):
    """log(1 + R) = location + scale T, T standard Student t of more than 2 degrees of freedom, scale >= 0.

    E[R] is infinite: the upper tail of T is heavier than any exponential. `deviation`: that of the log growth, where
    it is known better than the scale gives it.
    """

    method = "quadrature"
    numerical_error = 1e-13

    def __init__(
        self, degrees_of_freedom: Numbers, location: Numbers, scale: Numbers, deviation: Numbers | None = None
    ) -> None:
        self.degrees_of_freedom = degrees_of_freedom
        self.location = location
        self.scale = scale
        self._deviation = deviation_of_t(degrees_of_freedom, scale) if deviation is None else deviation

    def _distance(self, threshold: Numbers) -> Numbers:
        return log_growth_factor(threshold) - self.location

    def _unless_certain(self, figure: Numbers, certain: Numbers) -> Numbers:
        return np.where(self.scale + 0 * self.degrees_of_freedom > 0, figure, certain)

    def mean(self) -> Numbers:
        return self._unless_certain(INFINITY, np.expm1(self.location))

    def standard_deviation(self) -> Numbers:
        return self._unless_certain(INFINITY, number(0))

    def probability_below(self, threshold: Numbers) -> Numbers:
        z = score(self._distance(threshold), self.scale, LOG_COINCIDENCE)
        return t_at_most(self.degrees_of_freedom, z)

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        z = score(-self._distance(threshold), self.scale, LOG_COINCIDENCE)
        return t_at_most(self.degrees_of_freedom, -z)

    def certain(self, threshold: Numbers) -> Truths:
        everywhere = 0 * (self.degrees_of_freedom + self.location)
        return np.asarray((self.scale + everywhere == 0) | (threshold <= -1))

    def gaps(self, threshold: Numbers) -> Gaps:
        distance = self._distance(threshold)
        z = score(distance, self.scale, LOG_COINCIDENCE)
        first, second = relative_t_gaps(self.degrees_of_freedom, distance, self.scale, z)
        growth = np.maximum(1 + threshold, 0.0)
        return Gaps(growth * first, growth * (growth * second))

    def quantile(self, probability: Numbers) -> Numbers:
        return np.expm1(self.location + self.scale * t_at(self.degrees_of_freedom, probability))

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        return self._unless_certain(NO_VALUE, -np.expm1(self.location) + 0 * probability)

    def log_growth(self) -> LogGrowth:
        return LogGrowth(self.location, self._deviation)

    def total_loss_probability(self) -> Numbers:
        return 0 * (self.location + self.scale + self.degrees_of_freedom)

    def ordering(self) -> Ordering:
        location, scale, shape = np.broadcast_arrays(self.location, self.scale, self.degrees_of_freedom)
        return Ordering("exponential_t", shape, location, scale, np.full(location.shape, NO_VALUE))


def predictive_log_growth(
    log_mean: Numbers, log_deviation: Numbers, periods: Numbers, sample_size: Numbers
) -> ExponentialTLaw:
    """Log growth of n periods whose common mean and deviation are known from N: n m + s sqrt(n + n^2/N) t_(N-1).

    Zellner & Chetty 1965; the deviation has divisor N - 1.
    """
    scale = log_deviation * np.sqrt(periods + periods * periods / sample_size)
    return ExponentialTLaw(sample_size - 1, periods * log_mean, scale)


def relative_t_gaps(
    degrees_of_freedom: Numbers, distance: Numbers, scale: Numbers, z: Numbers
) -> tuple[Numbers, Numbers]:
    """E[max(1 - G/K, 0)] and the mean of its square for log G = location + scale T.

    distance = log K - location, and z is its score. Both are integrals of density(t) (1 - exp(-scale (z - t)))^j over
    t < z, whose terms are all positive: ten panels of 36 points in asinh(t), finer towards z. A scale of 0 with
    z = +-inf is a point mass.
    """
    shape, (v, ell, c, score_) = flat(degrees_of_freedom, distance, scale, z)
    certain = -np.expm1(-np.where(score_ > 0, ell, 0.0))
    first, second = certain.copy(), certain * certain
    spread = np.flatnonzero(np.isfinite(score_))
    for start in range(0, spread.size, BLOCK):
        i = spread[start : start + BLOCK]
        first[i], second[i] = _by_quadrature(v[i], c[i], np.maximum(score_[i], -FARTHEST))
    return first.reshape(shape), second.reshape(shape)


def _by_quadrature(v: Numbers, c: Numbers, z: Numbers) -> tuple[Numbers, Numbers]:
    rate = 2 * DEPTH / (v + 1)
    least = np.minimum(z, 0.0)
    bottom = -np.sqrt(v * np.expm1(rate) + least * least * np.exp(rate))
    top = np.minimum(z, np.sqrt(v * np.expm1(rate)))
    top_angle, width = np.arcsinh(top), np.arcsinh(top) - np.arcsinh(bottom)
    first, second = np.zeros(z.size), np.zeros(z.size)
    for begin, end in pairwise(PANELS):
        r = width * begin + MEDIUM.over(width * (end - begin))
        below_top = 2 * np.sinh(r / 2) * np.cosh(top_angle - r / 2)
        relative_gap = -np.expm1(-c * ((z - top) + below_top))
        t = np.sinh(top_angle - r)
        once = np.exp(log_t_density(v, t)) * np.hypot(1, t) * relative_gap
        first += width * (end - begin) * MEDIUM.mean(once)
        second += width * (end - begin) * MEDIUM.mean(once * relative_gap)
    return first, second
