"""The logistic distribution."""

import numpy as np
from scipy.special import expit, log_expit

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.parameters import anywhere, positive


class Logistic(Family):
    """Bell-shaped with tails somewhat heavier than the normal law's.

    Both tails are 1/(1 + exp(-z)) and 1/(1 + exp(z)) with z = (x - location)/scale; the quantile near the median by
    the inverse hyperbolic tangent. Error 2 eps, eps |log p| in a tail.
    """

    name = "logistic"
    support_words = "every number"
    numerical_error = 1e-15
    location = anywhere("the centre", example=0.05)
    scale = positive("the width", example=0.1)

    def _score(self, x: Numbers) -> Numbers:
        return (x - self.location) / self.scale

    def tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(expit(z), expit(-z))

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(log_expit(z), log_expit(-z))

    def log_density(self, x: Numbers) -> Numbers:
        distance = np.abs(self._score(x))
        value: Numbers = -distance - 2 * np.log1p(np.exp(-distance)) - np.log(self.scale)
        return value

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        # 2 p - 1 is exact near 1/2
        near = 2 * np.arctanh(2 * np.clip(probability, 0.25, 0.75) - 1)
        z = np.where(np.abs(probability - 0.5) < 0.25, near, np.log(probability) - np.log1p(-probability))
        return self.location - self.scale * z if upper else self.location + self.scale * z

    def moments(self) -> Moments:
        nought = 0 * (self.location + self.scale)
        return Moments(self.location + nought, self.scale * (np.pi / np.sqrt(3)) + nought, nought, nought + 1.2)

    def most_likely(self) -> Numbers:
        return self.location

    def entropy(self) -> Numbers:
        return np.log(self.scale) + 2

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
