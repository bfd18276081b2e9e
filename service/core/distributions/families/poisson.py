"""The Poisson distribution."""

import numpy as np

from service.core.arrays import INFINITY, Numbers, number
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.incomplete_gamma import log_gamma_tails
from service.core.distributions.kernels.lattice import lattice_entropy, lattice_quantile, smallest_mode
from service.core.distributions.kernels.saddle_point import log_poisson_mass
from service.core.parameters import positive


def log_tails(k: Numbers, rate: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(X <= k) = Q(k + 1, rate) and P(X > k) = P(k + 1, rate) for whole k."""
    above, at_most = log_gamma_tails(np.maximum(k, 0) + 1, rate)
    return np.where(k < 0, -np.inf, at_most)[()], np.where(k < 0, 0, above)[()]


class Poisson(Family):
    """The number of events in a span of time when they come independently at a steady rate: claims, defaults, jumps.

    Masses in Loader's saddle-point form, tails by the incomplete gamma functions (see `log_gamma_tails`). Against
    mpmath: 2e-13 relative down to 1e-300, quantiles exact; rates to 1e12.
    """

    name = "poisson"
    discrete = True
    support_words = "the whole numbers from 0"
    method = "saddle_point_and_quadrature"
    quantile_method = "bisection_on_exact_tail"
    numerical_error = 1e-13
    rate = positive("the expected number of events", at_most=1e12, example=3.5)

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_tails(np.floor(x), self.rate))

    def log_density(self, x: Numbers) -> Numbers:
        possible = (x >= 0) & (x == np.floor(x))
        return np.where(possible, log_poisson_mass(np.where(possible, x, 0), self.rate), -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        return lattice_quantile(
            log_tails, probability, self.rate, upper=upper, moments=self.moments()[:3], ends=self.support()
        )

    def moments(self) -> Moments:
        spread = np.sqrt(self.rate)
        return Moments(self.rate, spread, 1 / spread, 1 / self.rate)

    def most_likely(self) -> Numbers:
        return smallest_mode(self.rate)

    def entropy(self) -> Numbers:
        mean, spread, _, _ = self.moments()
        return lattice_entropy(log_poisson_mass, self.rate, moments=(mean, spread), ends=self.support())

    def support(self) -> Support:
        return Support(number(0.0), INFINITY)
