"""The normal distribution."""

import numpy as np
from scipy.special import log_ndtr, ndtr, ndtri

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.elementary import HALF_LOG_2PI, SQRT_2PI
from service.core.parameters import anywhere, positive


class Normal(Family):
    """Sums of many small independent effects; the plainest model of a return.

    Both tails are Phi(z) and Phi(-z) with z = (x - mean)/standard_deviation, in logarithms where they underflow
    (Abramowitz & Stegun 26.2). Error of scipy.special's ndtr, log_ndtr and ndtri against mpmath: 2e-13 relative at a
    probability of 1e-300, 1e-15 in the body.
    """

    name = "normal"
    support_words = "every number"
    numerical_error = 1e-15
    mean = anywhere("the centre", example=10)
    standard_deviation = positive("the spread around the centre", example=2)

    def _score(self, x: Numbers) -> Numbers:
        return (x - self.mean) / self.standard_deviation

    def tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(ndtr(z), ndtr(-z))

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(log_ndtr(z), log_ndtr(-z))

    def density(self, x: Numbers) -> Numbers:
        z = self._score(x)
        return np.exp(-z * z / 2) / (SQRT_2PI * self.standard_deviation)

    def log_density(self, x: Numbers) -> Numbers:
        z = self._score(x)
        return -z * z / 2 - HALF_LOG_2PI - np.log(self.standard_deviation)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        distance = self.standard_deviation * ndtri(probability)
        return self.mean - distance if upper else self.mean + distance

    def moments(self) -> Moments:
        nought = 0 * (self.mean + self.standard_deviation)
        return Moments(self.mean + nought, self.standard_deviation + nought, nought, nought)

    def most_likely(self) -> Numbers:
        return self.mean

    def entropy(self) -> Numbers:
        return np.log(self.standard_deviation) + (HALF_LOG_2PI + 0.5)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
