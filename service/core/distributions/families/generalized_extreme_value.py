"""The generalized extreme value distribution."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.extreme_value import EULER_GAMMA, extreme_moments
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.powers import box_cox_root, log_box_cox
from service.core.parameters import Parameter, anywhere, positive


class GeneralizedExtremeValue(Family):
    """The largest of many values, such as the worst day of a year; a shape above 0 gives the heavy tail.

    P(X <= x) = exp(-y) with log y = -log1p(shape z)/shape, z = (x - location)/scale (Jenkinson 1955), and -z for shape
    0. Against mpmath: 1e-13 relative at 1e-300, 1e-15 in the body; moments by zeta series (see `extreme_moments`).
    """

    name = "generalized_extreme_value"
    support_words = "x > location - scale/shape for shape > 0, below it for shape < 0, every number for shape 0"
    numerical_error = 1e-12
    location = anywhere("the place of the law", example=0.02)
    scale = positive("the width", example=0.01)
    shape = Parameter("the weight of the upper tail; 0 is Gumbel's law", at_least=-5, at_most=5, example=0.2)

    def _log_y(self, x: Numbers) -> Numbers:
        return -log_box_cox((x - self.location) / self.scale, self.shape)

    def log_tails(self, x: Numbers) -> Tails:
        log_y = self._log_y(x)
        log_at_most = -np.exp(log_y)
        return Tails(log_at_most, np.where(log_y < -40, log_y, log_complement(log_at_most))[()])

    def log_density(self, x: Numbers) -> Numbers:
        log_y = self._log_y(x)
        value = (1 + self.shape) * log_y - np.exp(log_y) - np.log(self.scale)
        return np.where(np.isfinite(log_y), value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        y = -np.log1p(-probability) if upper else -np.log(probability)
        other = 1 - probability
        exact = -np.log(other) if upper else -np.log1p(-other)
        log_y = np.log(np.where(probability > 0.5, exact, y))
        return self.location + self.scale * box_cox_root(-log_y, self.shape)

    def moments(self) -> Moments:
        mean, spread, skewness, excess = extreme_moments(self.shape)
        return Moments(self.location + self.scale * mean, self.scale * spread, skewness, excess)

    def most_likely(self) -> Numbers:
        # log y = log(1 + shape) there; a shape of -1 or less has its greatest density at the upper end
        return self.location + self.scale * box_cox_root(-np.log(np.maximum(1 + self.shape, 0)), self.shape)

    def entropy(self) -> Numbers:
        return np.log(self.scale) + EULER_GAMMA * (1 + self.shape) + 1

    def support(self) -> Support:
        end = self.location - self.scale / self.shape
        return Support(np.where(self.shape > 0, end, -np.inf)[()], np.where(self.shape < 0, end, np.inf)[()])
