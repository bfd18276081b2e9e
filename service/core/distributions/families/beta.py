"""The beta distribution."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.beta_quantile import beta_quantile
from service.core.distributions.kernels.incomplete_beta import (
    beta_entropy,
    beta_offset,
    log_beta_density,
    log_beta_tails,
)
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.parameters import positive


class Beta(Family):
    """Shares and probabilities between 0 and 1: recovery rates, what is known of an unknown success rate.

    Tails by the regularised incomplete beta function (see `log_beta_tails`), quantiles by Newton's method on the log
    tail. Against mpmath: 1e-14 relative in the body, 3e-13 at 1e-300; parameters from 1e-3 to 1e12.
    """

    name = "beta"
    support_words = "0 < x < 1"
    method = "saddle_point_and_quadrature"
    quantile_method = "newton_on_log_tail"
    numerical_error = 1e-13
    cost = Cost(4, 10, 16)
    alpha = positive("the pull towards 1", at_least=1e-3, at_most=1e12, example=2)
    beta = positive("the pull towards 0", at_least=1e-3, at_most=1e12, example=3)

    def log_tails(self, x: Numbers) -> Tails:
        inside = np.clip(x, 0, 1)
        offset = beta_offset(self.alpha, self.beta, inside, 1 - inside)
        return Tails(*log_beta_tails(self.alpha, self.beta, inside, 1 - inside, offset))

    def log_density(self, x: Numbers) -> Numbers:
        a, b = self.alpha, self.beta
        inside = np.where((x > 0) & (x < 1), x, 0.5)
        value = log_beta_density(a, b, inside, 1 - inside, beta_offset(a, b, inside, 1 - inside))
        value = value - np.log(inside) - np.log1p(-inside)
        at_0 = np.where(a == 1, np.log(b), np.where(a < 1, np.inf, -np.inf))
        at_1 = np.where(b == 1, np.log(a), np.where(b < 1, np.inf, -np.inf))
        value = np.where(x == 0, at_0, np.where(x == 1, at_1, value))
        return np.where((x >= 0) & (x <= 1), value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        return beta_quantile(self.alpha, self.beta, *smaller_tail(probability, upper))[0]

    def moments(self) -> Moments:
        a, b = self.alpha, self.beta
        n = a + b
        variance = a / n * (b / n) / (n + 1)
        skewness = 2 * (b - a) / (n + 2) * np.sqrt((n + 1) / a / b)
        excess = 6 * ((a - b) / a * ((a - b) / b) * (n + 1) - (n + 2)) / ((n + 2) * (n + 3))
        return Moments(a / n, np.sqrt(variance), skewness, excess)

    def most_likely(self) -> Numbers:
        a, b = self.alpha, self.beta
        inner = (a - 1) / (a + b - 2)
        ends = np.where(a < 1, 0.0, np.where(b < 1, 1.0, inner))
        return np.where((a == 1) & (b == 1), NO_VALUE, ends)[()]

    def entropy(self) -> Numbers:
        return beta_entropy(self.alpha, self.beta)

    def support(self) -> Support:
        return Support(number(0.0), number(1.0))
