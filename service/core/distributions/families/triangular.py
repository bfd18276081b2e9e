"""The triangular distribution."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.parameters import Order, anywhere


class Triangular(Family):
    """A least, a most likely and a greatest value, as an expert may name them.

    Squares of the distance from the nearer end, beyond the mode sums of positive terms; the quantile beyond the mode
    is solved for the distance from it. Error 4 eps.
    """

    name = "triangular"
    support_words = "lower <= x <= upper"
    numerical_error = 2e-15
    lower = anywhere("the lower end", example=-0.2)
    mode = anywhere("the most likely value", example=0.05)
    upper = anywhere("the upper end", example=0.4)
    rules = (
        Order("lower", "mode", or_equal=True),
        Order("mode", "upper", or_equal=True),
        Order("lower", "upper"),
    )

    @property
    def _arms(self) -> tuple[Numbers, Numbers, Numbers]:
        """Lengths: from the lower end to the mode, from there to the upper end, and the whole."""
        return self.mode - self.lower, self.upper - self.mode, self.upper - self.lower

    def tails(self, x: Numbers) -> Tails:
        left, right, width = self._arms
        inside = np.clip(x, self.lower, self.upper)
        below, above, past = inside - self.lower, self.upper - inside, inside - self.mode
        rising = (past <= 0) & (left > 0)
        at_most = np.where(rising, below / width * (below / left), left / width + past / width * (1 + above / right))
        falling = (past >= 0) & (right > 0)
        rest = np.where(falling, above / width * (above / right), right / width - past / width * (1 + below / left))
        return Tails(np.where(above <= 0, 1, at_most)[()], np.where(below <= 0, 1, rest)[()])

    def density(self, x: Numbers) -> Numbers:
        left, right, width = self._arms
        rising, falling = (x - self.lower) / width / left, (self.upper - x) / width / right
        height = np.where(x < self.mode, rising, np.where(x > self.mode, falling, 1 / width))
        return np.where((x >= self.lower) & (x <= self.upper), 2 * height, 0)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        left, right, width = self._arms
        at_most, above = (1 - probability, probability) if upper else (probability, 1 - probability)
        from_lower = self.lower + np.sqrt(at_most * width) * np.sqrt(left)
        from_upper = self.upper - np.sqrt(above * width) * np.sqrt(right)
        past = (at_most - left / width) * width / (1 + np.sqrt(above * width / right))
        before = (above - right / width) * width / (1 + np.sqrt(at_most * width / left))
        in_left = (above >= right / width if upper else at_most <= left / width) & (left > 0)
        value_left = np.where((above < 0.5) & (left > 0), self.mode - before, from_lower)
        value_right = np.where((at_most < 0.5) & (right > 0), self.mode + past, from_upper)
        value: Numbers = np.where(in_left, value_left, value_right)[()]
        return value

    def moments(self) -> Moments:
        left, right, width = self._arms
        h, k = right / width, left / width
        square = h * h + h * k + k * k
        skewness = np.sqrt(2) * (h - k) * (2 * k + h) * (2 * h + k) / (5 * square**1.5)
        mean = self.lower + (right + 2 * left) / 3
        return Moments(mean, width * np.sqrt(square / 18), skewness, 0 * width - 0.6)

    def most_likely(self) -> Numbers:
        return self.mode

    def entropy(self) -> Numbers:
        return np.log(self._arms[2] / 2) + 0.5

    def support(self) -> Support:
        return Support(self.lower, self.upper)
