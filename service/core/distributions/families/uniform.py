"""The uniform distribution."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.parameters import Order, anywhere


class Uniform(Family):
    """Every value between two ends equally likely: all that is known is the range.

    Distances from either end over the width. Error 2 eps.
    """

    name = "uniform"
    support_words = "lower <= x <= upper"
    numerical_error = 1e-15
    lower = anywhere("the lower end", example=10)
    upper = anywhere("the upper end", example=20)
    rules = (Order("lower", "upper"),)

    @property
    def _width(self) -> Numbers:
        return self.upper - self.lower

    def tails(self, x: Numbers) -> Tails:
        inside = np.clip(x, self.lower, self.upper)
        return Tails((inside - self.lower) / self._width, (self.upper - inside) / self._width)

    def density(self, x: Numbers) -> Numbers:
        return np.where((x >= self.lower) & (x <= self.upper), 1 / self._width, 0)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        distance = probability * self._width
        return self.upper - distance if upper else self.lower + distance

    def moments(self) -> Moments:
        nought = 0 * self._width
        return Moments(self.lower / 2 + self.upper / 2, self._width / np.sqrt(12), nought, nought - 1.2)

    def most_likely(self) -> Numbers:
        return NO_VALUE

    def entropy(self) -> Numbers:
        return np.log(self._width)

    def support(self) -> Support:
        return Support(self.lower, self.upper)
