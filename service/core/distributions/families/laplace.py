"""The Laplace distribution."""

import numpy as np

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import LOG_HALF, smaller_tail
from service.core.parameters import anywhere, positive


class Laplace(Family):
    """A sharp peak with exponential tails on either side: short-term returns, errors of forecasts.

    The smaller tail is exp(-|x - location|/scale)/2, the other its complement. Error 2 eps, eps |log p| in a tail.
    """

    name = "laplace"
    support_words = "every number"
    numerical_error = 1e-15
    location = anywhere("the centre", example=0.05)
    scale = positive("the mean distance from the centre", example=0.1)

    def _score(self, x: Numbers) -> Numbers:
        return (x - self.location) / self.scale

    def tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        small = 0.5 * np.exp(-np.abs(z))
        return Tails(np.where(z < 0, small, 1 - small)[()], np.where(z < 0, 1 - small, small)[()])

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        small = LOG_HALF - np.abs(z)
        large = np.log1p(-0.5 * np.exp(-np.abs(z)))
        return Tails(np.where(z < 0, small, large)[()], np.where(z < 0, large, small)[()])

    def log_density(self, x: Numbers) -> Numbers:
        return LOG_HALF - np.abs(self._score(x)) - np.log(self.scale)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        tail, lower = smaller_tail(probability, upper)
        # 1 - 2 p is exact near 1/2
        distance = np.where(tail > 0.25, -np.log1p(-(1 - 2 * np.maximum(tail, 0.2))), -np.log(2 * tail))
        return self.location + self.scale * np.where(lower, -distance, distance)

    def moments(self) -> Moments:
        nought = 0 * (self.location + self.scale)
        return Moments(self.location + nought, self.scale * np.sqrt(2) + nought, nought, nought + 3)

    def most_likely(self) -> Numbers:
        return self.location

    def entropy(self) -> Numbers:
        return np.log(self.scale) + (1 - LOG_HALF)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
