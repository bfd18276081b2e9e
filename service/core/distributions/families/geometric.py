"""The geometric distribution."""

import numpy as np
from scipy.special import entr

from service.core.arrays import INFINITY, NO_VALUE, Numbers, number
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import log_complement
from service.core.parameters import positive

TIE = 1e-15


class Geometric(Family):
    """The number of trials up to and with the first success.

    P(X > k) = (1 - p)^k, as exp(k log1p(-p)). Error 2 eps, eps |log p| in a tail; a quantile takes a probability within
    rounding of an attained one as equal to it.
    """

    name = "geometric"
    discrete = True
    support_words = "the whole numbers from 1"
    numerical_error = 4e-15
    success_probability = positive("the probability of success of each trial", at_least=1e-15, at_most=1, example=0.2)

    @property
    def _log_failure(self) -> Numbers:
        return np.log1p(-self.success_probability)

    def _log_above(self, x: Numbers) -> Numbers:
        k = np.maximum(np.floor(x), 0)
        return np.where(k > 0, k * self._log_failure, 0)[()]

    def tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(-np.expm1(log_above), np.exp(log_above))

    def log_tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(log_complement(log_above), log_above)

    def log_density(self, x: Numbers) -> Numbers:
        possible = (x >= 1) & (x == np.floor(x))
        return np.where(possible, np.log(self.success_probability) + self._log_above(x - 1), -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        count = (np.log(probability) if upper else np.log1p(-probability)) / self._log_failure
        nearest = np.round(count)
        whole = np.abs(count - nearest) <= TIE * np.abs(count)
        return np.maximum(np.where(whole, nearest, np.ceil(count)), 1)

    def moments(self) -> Moments:
        p = self.success_probability
        q = 1 - p
        spread = np.sqrt(q)
        with_spread = np.where(q > 0, spread, NO_VALUE)
        return Moments(1 / p, spread / p, ((1 + q) / with_spread)[()], (6 + p / with_spread * (p / with_spread))[()])

    def most_likely(self) -> Numbers:
        return number(1.0)

    def entropy(self) -> Numbers:
        p = self.success_probability
        return (entr(p) - (1 - p) * np.where(p < 1, self._log_failure, 0)) / p

    def support(self) -> Support:
        return Support(number(1.0), np.where(self.success_probability < 1, INFINITY, 1.0)[()])
