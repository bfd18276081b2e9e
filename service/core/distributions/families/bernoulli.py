"""The Bernoulli distribution."""

import numpy as np
from scipy.special import entr

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.parameters import Parameter

TIE = 4e-15


class Bernoulli(Family):
    """One trial that succeeds or fails: 1 for success, 0 for failure.

    Both tails are the two probabilities. Error 2 eps; a quantile takes a probability within 4e-15 of an attained one
    as equal to it.
    """

    name = "bernoulli"
    discrete = True
    support_words = "0 and 1"
    numerical_error = 1e-15
    success_probability = Parameter("the probability of 1", at_least=0, at_most=1, example=0.6)

    def tails(self, x: Numbers) -> Tails:
        p = self.success_probability
        return Tails(self._by_place(x, 0, 1 - p, 1), self._by_place(x, 1, p, 0))

    def log_tails(self, x: Numbers) -> Tails:
        p = self.success_probability
        return Tails(self._by_place(x, -np.inf, np.log1p(-p), 0), self._by_place(x, 0, np.log(p), -np.inf))

    @staticmethod
    def _by_place(x: Numbers, before: float, between: Numbers, beyond: float) -> Numbers:
        return np.where(x < 0, before, np.where(x < 1, between, beyond))[()]

    def density(self, x: Numbers) -> Numbers:
        p = self.success_probability
        return np.where(x == 0, 1 - p, np.where(x == 1, p, 0))[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        p = self.success_probability
        tail, lower = smaller_tail(probability, upper)
        success = np.where(lower, tail * (1 - TIE) > 1 - p, tail * (1 + TIE) < p)
        return np.where(success, 1.0, 0.0)[()]

    def moments(self) -> Moments:
        p = self.success_probability
        variance = p * (1 - p)
        spread = np.where(variance > 0, np.sqrt(variance), NO_VALUE)
        skewness = (1 - 2 * p) / spread
        return Moments(p, np.sqrt(variance), skewness[()], ((1 - 6 * variance) / spread / spread)[()])

    def most_likely(self) -> Numbers:
        return np.where(self.success_probability > 0.5, 1.0, 0.0)[()]

    def entropy(self) -> Numbers:
        p = self.success_probability
        return entr(p) + entr(1 - p)

    def support(self) -> Support:
        p = self.success_probability
        return Support(np.where(p < 1, 0.0, 1.0)[()], np.where(p > 0, 1.0, 0.0)[()])
