"""The discrete uniform distribution."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.parameters import Order, Parameter

TIE = 4e-16


class DiscreteUniform(Family):
    """Equally likely whole numbers: a fair die, a draw of one lot among many.

    Counts of whole numbers over their number. Error 2 eps; a quantile takes a probability within 2 eps of an attained
    one as equal to it.
    """

    name = "discrete_uniform"
    discrete = True
    support_words = "the whole numbers from lowest to highest"
    numerical_error = 4e-15
    lowest = Parameter("the least value", whole=True, at_least=-1e15, at_most=1e15, example=1)
    highest = Parameter("the greatest value", whole=True, at_least=-1e15, at_most=1e15, example=6)
    rules = (Order("lowest", "highest", or_equal=True),)

    @property
    def _count(self) -> Numbers:
        return self.highest - self.lowest + 1

    def tails(self, x: Numbers) -> Tails:
        k = np.clip(np.floor(x), self.lowest - 1, self.highest)
        return Tails((k - self.lowest + 1) / self._count, (self.highest - k) / self._count)

    def density(self, x: Numbers) -> Numbers:
        possible = (x >= self.lowest) & (x <= self.highest) & (x == np.floor(x))
        return np.where(possible, 1 / self._count, 0)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        tail, lower = smaller_tail(probability, upper)
        count = tail * self._count
        from_below = self.lowest - 1 + np.ceil(count * (1 - TIE))
        from_above = self.highest - np.floor(count * (1 + TIE))
        return np.clip(np.where(lower, from_below, from_above), self.lowest, self.highest)[()]

    def moments(self) -> Moments:
        n = self._count
        square = (n - 1) * (n + 1)
        spreads = np.where(n > 1, 1, NO_VALUE)[()]
        return Moments(
            self.lowest / 2 + self.highest / 2, np.sqrt(square / 12), 0 * spreads, spreads * -1.2 * (n * n + 1) / square
        )

    def most_likely(self) -> Numbers:
        return np.where(self._count > 1, NO_VALUE, self.lowest)[()]

    def entropy(self) -> Numbers:
        return np.log(self._count)

    def support(self) -> Support:
        return Support(self.lowest, self.highest)
