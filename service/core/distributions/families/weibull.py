"""The Weibull distribution."""

import numpy as np
from scipy.special import gamma

from service.core.arrays import INFINITY, Numbers, number
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.extreme_value import EULER_GAMMA, extreme_moments
from service.core.distributions.kernels.logarithms import log_complement
from service.core.parameters import positive


class Weibull(Family):
    """Lifetimes whose risk of ending rises (shape above 1) or falls with age.

    P(X > x) = exp(-(x/scale)^shape). Error 2 eps, eps |log p| in a tail; the spread, skewness and kurtosis are those of
    the generalized extreme value law of shape -1/shape (see `extreme_moments`).
    """

    name = "weibull"
    support_words = "x > 0"
    numerical_error = 2e-13
    shape = positive("below 1 the risk falls with age, above it rises", at_least=0.05, at_most=1e8, example=1.5)
    scale = positive("the age that one in e outlives", example=10)

    def _log_power(self, x: Numbers) -> Numbers:
        return self.shape * np.log(np.maximum(x, 0) / self.scale)

    def log_tails(self, x: Numbers) -> Tails:
        log_power = self._log_power(x)
        log_above = -np.exp(log_power)
        return Tails(np.where(log_power < -40, log_power, log_complement(log_above))[()], log_above)

    def log_density(self, x: Numbers) -> Numbers:
        log_power = self._log_power(x)
        value = np.log(self.shape) + log_power - np.log(np.maximum(x, 0)) - np.exp(log_power)
        flat = -np.log(self.scale)
        at_end = np.where(self.shape == 1, flat, np.where(self.shape < 1, np.inf, -np.inf))
        return np.where(x > 0, value, np.where(x == 0, at_end, -np.inf))[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        y = -(np.log(probability) if upper else np.log1p(-probability))
        return self.scale * y ** (1 / self.shape)

    def moments(self) -> Moments:
        mirrored = extreme_moments(-1 / self.shape)
        mean = self.scale * gamma(1 + 1 / self.shape)
        spread = self.scale * mirrored.standard_deviation / self.shape
        return Moments(mean, spread, -mirrored.skewness, mirrored.excess_kurtosis)

    def most_likely(self) -> Numbers:
        return self.scale * np.maximum(1 - 1 / self.shape, 0) ** (1 / self.shape)

    def entropy(self) -> Numbers:
        return EULER_GAMMA * (1 - 1 / self.shape) + np.log(self.scale) - np.log(self.shape) + 1

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
