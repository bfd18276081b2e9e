"""The exponential distribution."""

import numpy as np

from service.core.arrays import INFINITY, Numbers, number
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import log_complement
from service.core.parameters import positive


class Exponential(Family):
    """The wait for an event that comes at a steady rate, whatever has passed before.

    exp(-rate x) and its complement by expm1. Error 2 eps, eps |log p| in the upper tail.
    """

    name = "exponential"
    support_words = "x >= 0"
    numerical_error = 1e-15
    rate = positive("events per unit of x", example=0.5)

    def _log_above(self, x: Numbers) -> Numbers:
        return -self.rate * np.maximum(x, 0)

    def tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(-np.expm1(log_above), np.exp(log_above))

    def log_tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(log_complement(log_above), log_above)

    def log_density(self, x: Numbers) -> Numbers:
        return np.where(x >= 0, np.log(self.rate) + self._log_above(x), -np.inf)[()]

    def density(self, x: Numbers) -> Numbers:
        return np.where(x >= 0, self.rate * np.exp(self._log_above(x)), 0)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        return -(np.log(probability) if upper else np.log1p(-probability)) / self.rate

    def moments(self) -> Moments:
        mean = 1 / self.rate
        return Moments(mean, mean, 0 * mean + 2, 0 * mean + 6)

    def most_likely(self) -> Numbers:
        return number(0.0)

    def entropy(self) -> Numbers:
        return 1 - np.log(self.rate)

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
