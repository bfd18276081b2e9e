"""The chi-square distribution."""

import numpy as np

from service.core.arrays import INFINITY, Numbers, number
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.gamma_quantile import gamma_quantile
from service.core.distributions.kernels.incomplete_gamma import gamma_entropy, log_gamma_density, log_gamma_tails
from service.core.distributions.kernels.logarithms import LOG_HALF, smaller_tail
from service.core.parameters import positive


class ChiSquare(Family):
    """Sums of squared standard normals: test statistics, and the error of an estimated variance.

    The gamma law of shape degrees_of_freedom/2 and scale 2 (see `log_gamma_tails`). Against mpmath: 1e-14 relative in
    the body, 2e-13 at 1e-300; degrees of freedom from 2e-6 to 2e12.
    """

    name = "chi_square"
    support_words = "x > 0"
    method = "saddle_point_and_quadrature"
    quantile_method = "newton_on_log_tail"
    numerical_error = 1e-13
    degrees_of_freedom = positive("the number of squares summed", at_least=2e-6, at_most=2e12, example=10)

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_gamma_tails(self.degrees_of_freedom / 2, np.maximum(x, 0) / 2))

    def log_density(self, x: Numbers) -> Numbers:
        v = self.degrees_of_freedom
        inside = np.where(x > 0, x, 1.0)
        at_end = np.where(v == 2, LOG_HALF, np.where(v < 2, np.inf, -np.inf))
        value = log_gamma_density(v / 2, inside / 2) - np.log(inside)
        return np.where(x > 0, value, np.where(x == 0, at_end, -np.inf))[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        return 2 * gamma_quantile(self.degrees_of_freedom / 2, *smaller_tail(probability, upper))

    def moments(self) -> Moments:
        v = self.degrees_of_freedom
        return Moments(v, np.sqrt(2 * v), np.sqrt(8 / v), 12 / v)

    def most_likely(self) -> Numbers:
        mode: Numbers = np.maximum(self.degrees_of_freedom - 2, 0)
        return mode

    def entropy(self) -> Numbers:
        return gamma_entropy(self.degrees_of_freedom / 2) - LOG_HALF

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
