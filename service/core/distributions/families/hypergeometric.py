"""The hypergeometric distribution."""

from functools import cached_property

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.hypergeometric import log_hypergeometric_mass, log_hypergeometric_tails
from service.core.distributions.kernels.lattice import lattice_entropy, lattice_quantile, smallest_mode
from service.core.parameters import Order, Parameter


class Hypergeometric(Family):
    """Draws without putting back: how many of a sample are of the marked kind.

    Masses as three binomial masses in Loader's saddle-point form with exact offsets; tails by sums of masses outwards,
    or their Euler-Maclaurin integral for a standard deviation from 2,000 (see `log_hypergeometric_tails`). Against
    mpmath: 2e-13 relative down to 1e-300, quantiles exact; populations to 1e12.
    """

    name = "hypergeometric"
    discrete = True
    support_words = "the whole numbers from max(0, draws + marked - population) to min(draws, marked)"
    method = "saddle_point_and_quadrature"
    quantile_method = "bisection_on_exact_tail"
    numerical_error = 1e-13
    cost = Cost(3, 12, 70)
    population = Parameter("how many there are", whole=True, at_least=1, at_most=1e12, example=50)
    marked = Parameter("how many of them are of the marked kind", whole=True, at_least=0, at_most=1e12, example=5)
    draws = Parameter("how many are drawn", whole=True, at_least=0, at_most=1e12, example=10)
    rules = (Order("marked", "population", or_equal=True), Order("draws", "population", or_equal=True))

    @cached_property
    def _counts(self) -> tuple[Numbers, Numbers, Numbers]:
        return self.population, self.marked, self.draws

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_hypergeometric_tails(np.floor(x), *self._counts))

    def log_density(self, x: Numbers) -> Numbers:
        least, greatest = self.support()
        possible = (x >= least) & (x <= greatest) & (x == np.floor(x))
        value = log_hypergeometric_mass(np.where(possible, x, least), *self._counts)
        return np.where(possible, value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        return lattice_quantile(
            log_hypergeometric_tails,
            probability,
            *self._counts,
            upper=upper,
            moments=self.moments()[:3],
            ends=self.support(),
        )

    def moments(self) -> Moments:
        n, m, k = self._counts
        others, rest = n - m, n - k
        variance = np.where(n > 1, k * (m / n) * (others / n) * (rest / (n - 1)), 0)
        spread = np.where(variance > 0, np.sqrt(variance), NO_VALUE)
        skewness = ((n - 2 * m) / n) * ((n - 2 * k) / (n - 2)) / spread
        # shares of marked and drawn, so that no product leaves the exact range by much
        u, v = m / n * (others / n), k / n * (rest / n)
        top = (n - 1) / n * ((n + 1) / n - 6 * u - 6 * v) + 6 * u * v * (5 - 6 / n)
        excess = top / (u * v) / ((n - 2) * (n - 3)) * n
        skewness, excess = (np.where(variance > 0, f, NO_VALUE) for f in (skewness, excess))
        # two or three in all: one draw is a Bernoulli trial, and two of three leave one
        p = m / n
        one = (1 - 6 * p * (1 - p)) / (p * (1 - p))
        small = (n <= 3) & (variance > 0)
        lean = np.where(k == 1, 1, -1) * (1 - 2 * p) / np.sqrt(p * (1 - p))
        return Moments(
            k * p, np.sqrt(variance)[()], np.where(small, lean, skewness)[()], np.where(small, one, excess)[()]
        )

    def most_likely(self) -> Numbers:
        n, m, k = self._counts
        least, greatest = self.support()
        return np.clip(smallest_mode((k + 1) * ((m + 1) / (n + 2))), least, greatest)

    def entropy(self) -> Numbers:
        mean, spread, _, _ = self.moments()
        return lattice_entropy(log_hypergeometric_mass, *self._counts, moments=(mean, spread), ends=self.support())

    def support(self) -> Support:
        n, m, k = self._counts
        return Support(np.maximum(0, k + m - n), np.minimum(k, m))
