"""The lognormal distribution."""

import numpy as np
from scipy.special import log_ndtr, ndtr, ndtri

from service.core.arrays import INFINITY, Numbers, number
from service.core.declared import alternative
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.elementary import HALF_LOG_2PI, SQRT_2PI
from service.core.parameters import Parameter, positive


def _from_moments(mean: Numbers, standard_deviation: Numbers) -> dict[str, Numbers]:
    ratio = standard_deviation / mean
    variance = np.log1p(ratio * ratio)
    return {"log_mean": np.log(mean) - variance / 2, "log_standard_deviation": np.sqrt(variance)}


class Lognormal(Family):
    """Products of many small independent effects: a growth factor whose logarithm is normal.

    Both tails are those of the normal law at the logarithm. Error of scipy.special's ndtr, log_ndtr and ndtri against
    mpmath: 2e-13 relative at a probability of 1e-300, 1e-15 in the body.
    """

    name = "lognormal"
    support_words = "x > 0"
    numerical_error = 1e-13
    log_mean = Parameter("the mean of log X", at_least=-200, at_most=200, example=0.05)
    log_standard_deviation = positive("the standard deviation of log X", at_most=10, example=0.2)
    alternatives = (
        alternative(
            _from_moments,
            mean=positive("the mean of X itself", example=1.07),
            standard_deviation=positive("the standard deviation of X itself", example=0.2),
        ),
    )

    def _score(self, x: Numbers) -> Numbers:
        return (np.log(np.maximum(x, 0)) - self.log_mean) / self.log_standard_deviation

    def tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(ndtr(z), ndtr(-z))

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(log_ndtr(z), log_ndtr(-z))

    def density(self, x: Numbers) -> Numbers:
        z = self._score(x)
        return np.where(x > 0, np.exp(-z * z / 2) / (SQRT_2PI * self.log_standard_deviation * x), 0)[()]

    def log_density(self, x: Numbers) -> Numbers:
        z = self._score(x)
        value = -z * z / 2 - HALF_LOG_2PI - np.log(self.log_standard_deviation) - np.log(x)
        return np.where(x > 0, value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        distance = self.log_standard_deviation * ndtri(probability)
        return np.exp(self.log_mean - distance if upper else self.log_mean + distance)

    def moments(self) -> Moments:
        variance = self.log_standard_deviation**2
        excess = np.expm1(variance)
        w = np.exp(variance)
        mean = np.exp(self.log_mean + variance / 2)
        root = np.sqrt(excess)
        return Moments(mean, mean * root, (w + 2) * root, excess * (w**3 + 3 * w * w + 6 * w + 6))

    def most_likely(self) -> Numbers:
        return np.exp(self.log_mean - self.log_standard_deviation**2)

    def entropy(self) -> Numbers:
        return np.log(self.log_standard_deviation) + self.log_mean + (HALF_LOG_2PI + 0.5)

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
