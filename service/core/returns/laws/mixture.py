"""A return that follows one of several laws, each with a probability of its own."""

import numpy as np

from service.core.arrays import INFINITY, Numbers, Truths
from service.core.returns.law import Gaps, HorizonLaw, LogGrowth
from service.core.returns.laws.atoms import LEVEL_TIE
from service.core.returns.search import first_reaching


class MixtureLaw(HorizonLaw):
    """R follows component i of `parts`, a law with a flat array of them, with the probability weights[i].

    Probabilities and gaps are weighted sums of positive terms; quantiles by a bracketed search on the probability.
    """

    method = "exact_sum"

    def __init__(self, weights: Numbers, parts: HorizonLaw) -> None:
        self.weights = weights
        self.parts = parts
        self.numerical_error = parts.numerical_error + 1e-15 * float(np.sqrt(weights.size))
        self._tie = LEVEL_TIE if (parts.standard_deviation() == 0).any() else 0.0

    def _mean_and_spread(self, means: Numbers, deviations: Numbers) -> tuple[Numbers, Numbers]:
        mean = self.weights @ means
        unit = np.maximum(np.abs(means).max(), deviations.max()) + 1e-300
        scaled = np.square(deviations / unit) + np.square((means - mean) / unit)
        return mean, unit * np.sqrt(self.weights @ scaled)

    def mean(self) -> Numbers:
        return self.weights @ self.parts.mean()

    def standard_deviation(self) -> Numbers:
        means, deviations = self.parts.mean(), self.parts.standard_deviation()
        if not np.isfinite(deviations).all():
            return INFINITY
        return self._mean_and_spread(means, deviations)[1]

    def probability_below(self, threshold: Numbers) -> Numbers:
        return self.parts.probability_below(np.asarray(threshold)[..., np.newaxis]) @ self.weights

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return self.parts.probability_at_most(np.asarray(threshold)[..., np.newaxis]) @ self.weights

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(self.parts.certain(np.asarray(threshold)[..., np.newaxis]).all(axis=-1))

    def gaps(self, threshold: Numbers) -> Gaps:
        first, second = self.parts.gaps(np.asarray(threshold)[..., np.newaxis])
        return Gaps(first @ self.weights, second @ self.weights)

    def quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, probability - self._tie)

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, probability + self._tie)

    def _reaching(self, probability: Numbers, level: Numbers) -> Numbers:
        """Search between the components' own quantiles, on the scale of log growth where that has a value."""
        levels = np.ravel(level)
        own = self.parts.quantile(np.ravel(probability)[:, np.newaxis])
        low, high = own.min(axis=-1), own.max(axis=-1)
        margin = 1e-9 * (1 + np.abs(high))
        if (low > -1).all():
            low, high, margin = np.log1p(low), np.log1p(high), np.full_like(low, 1e-9)
            reached = first_reaching(
                lambda y: self.probability_at_most(np.expm1(y)) - levels, low - margin, high + margin
            )
            found: Numbers = np.expm1(reached)
        else:
            found = first_reaching(lambda x: self.probability_at_most(x) - levels, low - margin, high + margin)
        return found.reshape(np.shape(probability))[()]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # any quantile serves: E[max(q - R, 0)]/a - q
        quantile = self.upper_quantile(probability)
        return self.gaps(quantile).order_1 / probability - quantile

    def log_growth(self) -> LogGrowth:
        means, deviations = self.parts.log_growth()
        return LogGrowth(*self._mean_and_spread(means, deviations))

    def total_loss_probability(self) -> Numbers:
        return self.weights @ self.parts.total_loss_probability()
