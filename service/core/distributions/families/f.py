"""The F distribution."""

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, number
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.beta_quantile import beta_quantile
from service.core.distributions.kernels.incomplete_beta import log_beta_density, log_beta_tails, odds_entropy
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.parameters import positive


class F(Family):
    """Ratios of two estimated variances: is one series more volatile than another.

    The beta law at the share of the numerator (see `log_beta_tails`), formed with its offset from the mean exactly
    proportional to 1 - x. Against mpmath: 1e-14 relative in the body, 1e-13 at 1e-300.
    """

    name = "f"
    support_words = "x > 0"
    method = "saddle_point_and_quadrature"
    quantile_method = "newton_on_log_tail"
    numerical_error = 1e-13
    cost = Cost(4, 12, 16)
    numerator_degrees_of_freedom = positive("of the variance above", at_least=2e-3, at_most=1e12, example=5)
    denominator_degrees_of_freedom = positive("of the variance below", at_least=2e-3, at_most=1e12, example=10)

    @property
    def _shapes(self) -> tuple[Numbers, Numbers]:
        return self.numerator_degrees_of_freedom / 2, self.denominator_degrees_of_freedom / 2

    def _share(self, x: Numbers) -> tuple[Numbers, Numbers, Numbers]:
        """The numerator's share, the denominator's, and a - (a + b) times the first."""
        a, b = self._shapes
        ratio = a / b * x
        large = ratio > 1e300
        share = np.where(large, 1.0, ratio / (1 + ratio))
        rest = np.where(large, b / a / x, 1 / (1 + ratio))
        return share[()], rest[()], np.where(large, -b, a * ((1 - x) / (1 + ratio)))[()]

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_beta_tails(*self._shapes, *self._share(np.maximum(x, 0))))

    def log_density(self, x: Numbers) -> Numbers:
        a, b = self._shapes
        inside = np.where(x > 0, x, 1.0)
        value = log_beta_density(a, b, *self._share(inside)) - np.log(inside)
        at_end = np.where(a == 1, 0, np.where(a < 1, np.inf, -np.inf))
        return np.where(x > 0, value, np.where(x == 0, at_end, -np.inf))[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        a, b = self._shapes
        share, rest = beta_quantile(a, b, *smaller_tail(probability, upper))
        return b / a * (share / rest)

    def moments(self) -> Moments:
        m, n = self.numerator_degrees_of_freedom, self.denominator_degrees_of_freedom
        s = m + n - 2
        mean = np.where(n > 2, n / (n - 2), np.inf)
        spread = np.where(n > 4, mean * np.sqrt(2 * s / (m * (n - 4))), np.where(n > 2, np.inf, NO_VALUE))
        skewness = (2 * m + n - 2) / (n - 6) * np.sqrt(8 * (n - 4) / (m * s))
        top = (5 * n - 22) + (n - 4) * ((n - 2) / m) * ((n - 2) / s)
        excess = 12 * top / ((n - 6) * (n - 8))
        beyond = np.where(n > 4, np.inf, NO_VALUE)
        return Moments(mean[()], spread[()], np.where(n > 6, skewness, beyond)[()], np.where(n > 8, excess, beyond)[()])

    def most_likely(self) -> Numbers:
        m, n = self.numerator_degrees_of_freedom, self.denominator_degrees_of_freedom
        return np.maximum(m - 2, 0) / m * (n / (n + 2))

    def entropy(self) -> Numbers:
        a, b = self._shapes
        return odds_entropy(a, b) + np.log(b) - np.log(a)

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
