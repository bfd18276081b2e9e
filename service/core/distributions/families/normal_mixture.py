"""The mixture of normal distributions."""

from functools import cached_property

import numpy as np
from scipy.special import log_ndtr, logsumexp, ndtr, ndtri_exp

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers, flat
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.distributions.kernels.mixture import log_mixture_density, mixture_entropy, mixture_mode
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.parameters import Components, Parameter, anywhere, positive


class NormalMixture(Family):
    """Calm and stormy times in one law: each component is normal and rules with the probability of its weight.

    Tails are weighted sums of normal tails, in logarithms where they underflow; the quantile by Newton's method between
    the quantiles of the components. Against mpmath: 1e-14 relative in the body, 2e-13 at 1e-300.
    """

    name = "normal_mixture"
    support_words = "every number"
    quantile_method = "newton_on_log_tail"
    numerical_error = 2e-13
    cost = Cost(2, 4, 12)
    components = Components(
        "the normal laws that are mixed",
        share="weight",
        example=[
            {"weight": 0.8, "mean": 0.08, "standard_deviation": 0.12},
            {"weight": 0.2, "mean": -0.1, "standard_deviation": 0.3},
        ],
        weight=Parameter("the probability of the component", above=0, at_most=1, example=0.8),
        mean=anywhere("the component's mean", example=0.08),
        standard_deviation=positive("the component's standard deviation", example=0.12),
    )

    @cached_property
    def _parts(self) -> tuple[Numbers, Numbers, Numbers]:
        """Weights that add up to 1, means, standard deviations."""
        weights, means, spreads = self.components.T
        return weights / weights.sum(), means, spreads

    def _scores(self, x: Numbers) -> Numbers:
        _, means, spreads = self._parts
        return (x[..., None] - means) / spreads

    def tails(self, x: Numbers) -> Tails:
        z, weights = self._scores(x), self._parts[0]
        return Tails((weights * ndtr(z)).sum(axis=-1), (weights * ndtr(-z)).sum(axis=-1))

    def log_tails(self, x: Numbers) -> Tails:
        z, weights = self._scores(x), self._parts[0]
        return Tails(logsumexp(log_ndtr(z), b=weights, axis=-1), logsumexp(log_ndtr(-z), b=weights, axis=-1))

    def log_density(self, x: Numbers) -> Numbers:
        return log_mixture_density(x, *self._parts)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        tail, lower = smaller_tail(probability, upper)
        shape, (p, is_lower) = flat(tail, lower)
        value = np.empty_like(p)
        for side in (True, False):
            i = np.flatnonzero((is_lower > 0) == side)
            value[i] = self._tail_quantile(p[i], side)
        return value.reshape(shape)[()]

    def _tail_quantile(self, tail: Numbers, lower: bool) -> Numbers:
        """Quantile of one tail, which lies between the components' own; the start is outside, at p/weight of one."""
        weights, means, spreads = self._parts
        sign = 1 if lower else -1
        target = np.log(tail)
        own = means + spreads * (sign * ndtri_exp(target))[:, None]
        reached = np.minimum(target[:, None] - np.log(weights), -1e-12)
        alone = means + spreads * (sign * ndtri_exp(reached))
        low, high = own.min(axis=1), own.max(axis=1)
        slack = 1e-12 * (np.abs(low) + np.abs(high)) + 1e-300
        start = np.clip(alone.min(axis=1) if lower else alone.max(axis=1), low, high)
        return newton_on_log_tail(
            lambda x: self.log_tails(x)[0 if lower else 1],
            self.log_density,
            target,
            start,
            rising=lower,
            low=low - slack,
            high=high + slack,
        )

    def moments(self) -> Moments:
        weights, means, spreads = self._parts
        mean = (weights * means).sum()
        d, v = means - mean, spreads * spreads
        variance = (weights * (d * d + v)).sum()
        third = (weights * (d**3 + 3 * d * v)).sum()
        fourth = (weights * (d**4 + 6 * d * d * v + 3 * v * v)).sum()
        return Moments(mean, np.sqrt(variance), third / variance**1.5, fourth / variance**2 - 3)

    def most_likely(self) -> Numbers:
        return mixture_mode(*self._parts)

    def entropy(self) -> Numbers:
        return mixture_entropy(*self._parts)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
