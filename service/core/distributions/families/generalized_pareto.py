"""The generalized Pareto distribution."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import log_complement
from service.core.distributions.kernels.powers import box_cox_root, log_box_cox
from service.core.distributions.kernels.tail_powers import pareto_moments
from service.core.parameters import Parameter, anywhere, positive


class GeneralizedPareto(Family):
    """Excesses over a high threshold: by how much a loss exceeds the one that it exceeds rarely.

    log P(X > x) = -log1p(shape z)/shape, z = (x - location)/scale, and -z for shape 0 (Pickands 1975). Error 2 eps,
    eps |log p| in the upper tail.
    """

    name = "generalized_pareto"
    support_words = "x >= location, and x <= location - scale/shape for shape < 0"
    numerical_error = 1e-13
    location = anywhere("the threshold", example=0.02)
    scale = positive("the width", example=0.01)
    shape = Parameter("the weight of the tail; 0 is the exponential law", at_least=-5, at_most=5, example=0.2)

    def _log_above(self, x: Numbers) -> Numbers:
        return -log_box_cox(np.maximum(x - self.location, 0) / self.scale, self.shape)

    def tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(-np.expm1(log_above), np.exp(log_above))

    def log_tails(self, x: Numbers) -> Tails:
        log_above = self._log_above(x)
        return Tails(log_complement(log_above), log_above)

    def log_density(self, x: Numbers) -> Numbers:
        log_above = self._log_above(x)
        inside = (x >= self.location) & (self.shape * (x - self.location) / self.scale >= -1)
        # at the end of a bounded law log_above is -inf; shape -1 has a density of 1/scale up to there
        value = np.where(self.shape == -1, 0, (1 + self.shape) * log_above) - np.log(self.scale)
        return np.where(inside, value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        log_above = np.log(probability) if upper else np.log1p(-probability)
        return self.location + self.scale * box_cox_root(-log_above, self.shape)

    def moments(self) -> Moments:
        mean, spread, skewness, excess = pareto_moments(self.shape)
        return Moments(self.location + self.scale * mean, self.scale * spread, skewness, excess)

    def most_likely(self) -> Numbers:
        end = self.location - self.scale / self.shape
        bounded = np.where(self.shape < -1, end, NO_VALUE)
        return np.where(self.shape > -1, self.location, bounded)[()]

    def entropy(self) -> Numbers:
        return np.log(self.scale) + self.shape + 1

    def support(self) -> Support:
        end = self.location - self.scale / self.shape
        return Support(self.location, np.where(self.shape < 0, end, np.inf)[()])
