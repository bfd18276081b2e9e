"""The Gumbel distribution."""

import numpy as np

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.extreme_value import APERY, EULER_GAMMA
from service.core.distributions.kernels.logarithms import log_complement
from service.core.parameters import anywhere, positive


class Gumbel(Family):
    """The largest of many values with light tails: yearly peaks, worst losses under mild assumptions.

    P(X <= x) = exp(-exp(-z)), z = (x - location)/scale. Error 2 eps, eps |log p| in the upper tail.
    """

    name = "gumbel"
    support_words = "every number"
    numerical_error = 2e-15
    location = anywhere("the most likely value", example=0.02)
    scale = positive("the width", example=0.05)

    def _score(self, x: Numbers) -> Numbers:
        return (x - self.location) / self.scale

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        log_at_most = -np.exp(-z)
        return Tails(log_at_most, np.where(z > 40, -z, log_complement(log_at_most))[()])

    def log_density(self, x: Numbers) -> Numbers:
        z = self._score(x)
        return -z - np.exp(-z) - np.log(self.scale)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        y = -np.log1p(-probability) if upper else -np.log(probability)
        other = 1 - probability
        exact = -np.log(other) if upper else -np.log1p(-other)
        return self.location - self.scale * np.log(np.where(probability > 0.5, exact, y))

    def moments(self) -> Moments:
        nought = 0 * (self.location + self.scale)
        skewness = 12 * np.sqrt(6) * APERY / np.pi**3
        return Moments(
            self.location + self.scale * EULER_GAMMA,
            self.scale * (np.pi / np.sqrt(6)) + nought,
            nought + skewness,
            nought + 2.4,
        )

    def most_likely(self) -> Numbers:
        return self.location

    def entropy(self) -> Numbers:
        return np.log(self.scale) + (EULER_GAMMA + 1)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
