"""The negative binomial distribution."""

from collections.abc import Iterator, Mapping

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, number
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.elementary import two_product
from service.core.distributions.kernels.incomplete_beta import log_beta_tails
from service.core.distributions.kernels.lattice import lattice_quantile, long_lattice_entropy, smallest_mode
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.saddle_point import log_binomial_mass
from service.core.errors import Refusal
from service.core.parameters import positive

MOST_EXPECTED = 1e15


def log_tails(k: Numbers, r: Numbers, p: Numbers) -> tuple[Numbers, Numbers]:
    """Logarithms of P(X <= k) = I_p(r, k + 1) and P(X > k) = I_q(k + 1, r) for whole k; powers for r = 1."""
    failures = np.maximum(k, 0)
    high, low = two_product(r + failures + 1, p)
    at_most, above = log_beta_tails(r, failures + 1, p, 1 - p, (r - high) - low)
    by_power = (failures + 1) * np.log1p(-p)
    at_most = np.where(r == 1, log_complement(by_power), at_most)
    above = np.where(r == 1, by_power, above)
    return np.where(k < 0, -np.inf, at_most)[()], np.where(k < 0, 0, above)[()]


def log_mass(k: Numbers, r: Numbers, p: Numbers) -> Numbers:
    """Logarithm of r/(r + k) times the binomial mass of r successes in r + k trials."""
    return np.log(r / (r + k)) + log_binomial_mass(r, r + k, p, 1 - p)


class WithinExactCounts:
    """The expected number of failures is at most 1e15: beyond 2^53 doubles skip whole numbers."""

    words = "successes (1 - success_probability)/success_probability <= 1e15"

    def refusals(self, values: Mapping[str, Numbers]) -> Iterator[Refusal]:
        """Refuse the first entry that expects more failures than a double can count."""
        p = values["success_probability"]
        expected = np.asarray(values["successes"] * (1 - p) / p)
        if (expected <= MOST_EXPECTED).all():
            return
        place = int(np.argmax(expected > MOST_EXPECTED))
        at = (place,) if np.ndim(p) else ()
        given = float(np.ravel(expected)[place])
        detail = f"These parameters expect {given:.6g} failures; at most 1e15 can be counted."
        yield Refusal(
            ("success_probability", *at), "not_representable", detail, {"at_most": MOST_EXPECTED, "given": given}
        )


class NegativeBinomial(Family):
    """The number of failures before a given number of successes; counts that scatter more than Poisson's.

    Masses in Loader's saddle-point form, tails by the incomplete beta function (see `log_beta_tails`). Against mpmath:
    1e-13 relative down to 1e-300, quantiles exact; successes to 1e10, which need not be whole.
    """

    name = "negative_binomial"
    discrete = True
    support_words = "the whole numbers from 0"
    method = "saddle_point_and_quadrature"
    quantile_method = "bisection_on_exact_tail"
    numerical_error = 1e-13
    cost = Cost(5, 20, 85)
    successes = positive("the number of successes waited for", at_least=1e-3, at_most=1e10, example=3)
    success_probability = positive("the probability of success of each trial", at_least=1e-9, at_most=1, example=0.4)
    rules = (WithinExactCounts(),)

    def log_tails(self, x: Numbers) -> Tails:
        return Tails(*log_tails(np.floor(x), self.successes, self.success_probability))

    def log_density(self, x: Numbers) -> Numbers:
        possible = (x >= 0) & (x == np.floor(x))
        value = log_mass(np.where(possible, x, 0), self.successes, self.success_probability)
        return np.where(possible, value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        r, p = self.successes, self.success_probability
        return lattice_quantile(
            log_tails, probability, r, p, upper=upper, moments=self.moments()[:3], ends=self.support()
        )

    def moments(self) -> Moments:
        r, p = self.successes, self.success_probability
        q = 1 - p
        root = np.sqrt(r * q)
        with_spread = np.where(q > 0, root, NO_VALUE)
        excess = 6 / r + p / with_spread * (p / with_spread)
        return Moments(r * q / p, root / p, ((1 + q) / with_spread)[()], excess[()])

    def most_likely(self) -> Numbers:
        return smallest_mode((self.successes - 1) * (1 - self.success_probability) / self.success_probability)

    def entropy(self) -> Numbers:
        mean, spread, _, _ = self.moments()
        far = self.quantile(number(1e-22), upper=True)
        r, p = self.successes, self.success_probability
        return long_lattice_entropy(log_mass, r, p, moments=(mean, spread), far=far)

    def support(self) -> Support:
        return Support(number(0.0), np.where(self.success_probability < 1, INFINITY, 0.0)[()])
