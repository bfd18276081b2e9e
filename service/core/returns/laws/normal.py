"""A normally distributed return."""

import numpy as np
from scipy.special import ndtr, ndtri

from service.core.arrays import Numbers, Truths, number
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, Ordering, log_growth_of_point, score
from service.core.returns.mills import mills_ratio, partial_moments


class NormalLaw(HorizonLaw):
    """R ~ N(location, scale^2), scale >= 0."""

    numerical_error = 1e-15

    def __init__(self, location: Numbers, scale: Numbers) -> None:
        self.location: Numbers
        self.scale: Numbers
        self.location, self.scale = np.broadcast_arrays(location, scale)

    def _score(self, threshold: Numbers) -> Numbers:
        return score(threshold - self.location, self.scale, COINCIDENCE * (1 + np.abs(threshold)))

    def mean(self) -> Numbers:
        return self.location

    def standard_deviation(self) -> Numbers:
        return self.scale

    def probability_below(self, threshold: Numbers) -> Numbers:
        return ndtr(self._score(threshold))

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        # from the other side, where a point mass on the threshold counts
        return ndtr(-score(self.location - threshold, self.scale, COINCIDENCE * (1 + np.abs(threshold))))

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(self.scale + 0 * threshold == 0)

    def gaps(self, threshold: Numbers) -> Gaps:
        z = self._score(threshold)
        distance, spread = np.broadcast_arrays(threshold - self.location, self.scale)
        return Gaps(*partial_moments(distance, spread, z))

    def quantile(self, probability: Numbers) -> Numbers:
        return self.location + self.scale * ndtri(probability)

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # density(z)/probability is the reciprocal of Mills' ratio
        mean_of_tail = self.location - self.scale / mills_ratio(-ndtri(probability))
        return -mean_of_tail

    def log_growth(self) -> LogGrowth:
        return log_growth_of_point(self.location, self.scale)

    def total_loss_probability(self) -> Numbers:
        return self.probability_at_most(number(-1))

    def ordering(self) -> Ordering:
        return Ordering("normal", np.zeros_like(self.scale), self.location, self.scale, self.location)
