"""The binomial distribution."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.elementary import two_product
from service.core.distributions.kernels.incomplete_beta import log_beta_tails
from service.core.distributions.kernels.lattice import lattice_entropy, lattice_quantile, smallest_mode
from service.core.distributions.kernels.saddle_point import log_binomial_mass
from service.core.parameters import Parameter


def log_tails(k: Numbers, n: Numbers, p: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(X <= k) = I_q(n - k, k + 1) and P(X > k) = I_p(k + 1, n - k) for whole k."""
    hits = np.clip(k, 0, np.maximum(n - 1, 0))
    high, low = two_product(n, p)
    offset = ((hits + 1 - high) - low) - p
    above, at_most = log_beta_tails(hits + 1, np.maximum(n - hits, 1), p, 1 - p, offset)
    return (
        np.where(k < 0, -np.inf, np.where(k >= n, 0, at_most))[()],
        np.where(k < 0, 0, np.where(k >= n, -np.inf, above))[()],
    )


class Binomial(Family):
    """The number of successes in independent trials of one kind: how many of ten moves go up.

    Masses in Loader's saddle-point form, tails by the incomplete beta function (see `log_beta_tails`) with k - n p
    formed by an exact product. Against mpmath: 1e-13 relative down to 1e-300, quantiles exact; trials to 1e12.
    """

    name = "binomial"
    discrete = True
    support_words = "the whole numbers from 0 to trials"
    method = "saddle_point_and_quadrature"
    quantile_method = "bisection_on_exact_tail"
    numerical_error = 1e-13
    cost = Cost(3, 6, 22)
    trials = Parameter("the number of trials", whole=True, at_least=0, at_most=1e12, example=10)
    success_probability = Parameter("the probability of success of each trial", at_least=0, at_most=1, example=0.6)

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_tails(np.floor(x), self.trials, self.success_probability))

    def log_density(self, x: Numbers) -> Numbers:
        n, p = self.trials, self.success_probability
        possible = (x >= 0) & (x <= n) & (x == np.floor(x))
        return np.where(possible, log_binomial_mass(np.where(possible, x, 0), n, p, 1 - p), -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        n, p = self.trials, self.success_probability
        return lattice_quantile(
            log_tails, probability, n, p, upper=upper, moments=self.moments()[:3], ends=self.support()
        )

    def moments(self) -> Moments:
        n, p = self.trials, self.success_probability
        variance = n * p * (1 - p)
        spread = np.where(variance > 0, np.sqrt(variance), NO_VALUE)
        excess = (1 - 6 * p * (1 - p)) / spread / spread
        return Moments(n * p, np.sqrt(variance), ((1 - 2 * p) / spread)[()], excess[()])

    def most_likely(self) -> Numbers:
        return smallest_mode((self.trials + 1) * self.success_probability)

    def entropy(self) -> Numbers:
        n, p = self.trials, self.success_probability
        mean, spread, _, _ = self.moments()
        return lattice_entropy(
            lambda k, n, p: log_binomial_mass(k, n, p, 1 - p), n, p, moments=(mean, spread), ends=self.support()
        )

    def support(self) -> Support:
        n, p = self.trials, self.success_probability
        return Support(np.where(p < 1, 0, n)[()], np.where(p > 0, n, 0)[()])
