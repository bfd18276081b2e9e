"""The Pareto distribution."""

import numpy as np

from service.core.arrays import INFINITY, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.tail_powers import pareto_moments
from service.core.parameters import positive


class Pareto(Family):
    """Incomes, fortunes and large losses: a few hold most.

    log P(X > x) = -shape log(x/minimum), near the minimum by log1p. Error 2 eps, eps |log p| in the upper tail.
    """

    name = "pareto"
    support_words = "x >= minimum"
    numerical_error = 1e-13
    minimum = positive("the least value", example=1000)
    shape = positive("the smaller, the heavier the tail", at_least=1e-3, at_most=1e8, example=3)

    def _log_above(self, x: Numbers) -> Numbers:
        excess = np.maximum(x - self.minimum, 0) / self.minimum
        log_ratio = np.where(excess < 1, np.log1p(excess), np.log(np.maximum(x, self.minimum) / self.minimum))
        return -self.shape * log_ratio

    def tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(-np.expm1(log_above), np.exp(log_above))

    def log_tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(log_complement(log_above), log_above)

    def log_density(self, x: Numbers) -> Numbers:
        value = np.log(self.shape) + self._log_above(x) - np.log(np.maximum(x, self.minimum))
        return np.where(x >= self.minimum, value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        log_above = np.log(probability) if upper else np.log1p(-probability)
        return self.minimum * np.exp(-log_above / self.shape)

    def moments(self) -> Moments:
        excess = pareto_moments(1 / self.shape)
        scale = self.minimum / self.shape
        return Moments(
            self.minimum + scale * excess.mean,
            scale * excess.standard_deviation,
            excess.skewness,
            excess.excess_kurtosis,
        )

    def most_likely(self) -> Numbers:
        return self.minimum

    def entropy(self) -> Numbers:
        return np.log(self.minimum) - np.log(self.shape) + 1 / self.shape + 1

    def support(self) -> Support:
        return Support(self.minimum, INFINITY)
