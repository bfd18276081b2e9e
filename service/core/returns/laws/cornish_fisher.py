"""A return, or a log return, that is a Cornish-Fisher transformation of a normal law."""

import numpy as np
from scipy.special import ndtr, ndtri

from service.core.arrays import INFINITY, NO_VALUE, Numbers, Truths, number
from service.core.distributions.kernels.cornish_fisher import Expansion, inverse, shape_moments
from service.core.returns.law import (
    COINCIDENCE,
    Gaps,
    HorizonLaw,
    LogGrowth,
    log_growth_factor,
    log_growth_of_point,
    score,
)
from service.core.returns.mills import mills_ratio
from service.core.returns.normal_tail import moments_below


class CornishFisherLaw(HorizonLaw):
    """R = location + scale w(Z), Z standard normal and w a monotone expansion, scale >= 0."""

    method = "closed_form_and_quadrature"
    numerical_error = 1e-13

    def __init__(self, location: Numbers, scale: Numbers, expansion: Expansion) -> None:
        self.location: Numbers
        self.scale: Numbers
        self.location, self.scale, *coefficients = np.broadcast_arrays(location, scale, *expansion)
        self.expansion = Expansion(*coefficients)

    def _distance(self, threshold: Numbers) -> Numbers:
        return threshold - self.location

    def _closeness(self, threshold: Numbers) -> Numbers:
        return COINCIDENCE * (1 + np.abs(threshold))

    def _standard_score(self, distance: Numbers, closeness: Numbers) -> Numbers:
        """Z at which the return lies at this distance from its location; +-inf for a point mass."""
        shape = score(distance, self.scale, closeness)
        return np.where(np.isfinite(shape), inverse(np.where(np.isfinite(shape), shape, 0.0), self.expansion), shape)

    def _score(self, threshold: Numbers) -> Numbers:
        return self._standard_score(self._distance(threshold), self._closeness(threshold))

    def mean(self) -> Numbers:
        return self.location

    def standard_deviation(self) -> Numbers:
        return self.scale * shape_moments(self.expansion)[0]

    def probability_below(self, threshold: Numbers) -> Numbers:
        return ndtr(self._score(threshold))

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        distance = self._distance(threshold)
        # a point mass on the threshold counts
        return ndtr(self._standard_score(distance, np.where(self.scale > 0, 0.0, -self._closeness(threshold))))

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(self.scale + 0 * threshold == 0)

    def gaps(self, threshold: Numbers) -> Gaps:
        z = self._score(threshold)
        spread = np.isfinite(z)
        first, second = moments_below(
            lambda t, z, *c: _fall(t, z, Expansion(*c)), np.where(spread, z, 0.0), *self.expansion
        )
        sure = np.where(z > 0, self._distance(threshold), 0.0)
        return Gaps(
            np.where(spread, self.scale * first, sure), np.where(spread, self.scale * self.scale * second, sure * sure)
        )

    def quantile(self, probability: Numbers) -> Numbers:
        return self.location + self.scale * self.expansion.value(ndtri(probability))

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # E[H_k(Z); Z < z] = -H_(k-1)(z) density(z), and density(z)/probability is the reciprocal of Mills' ratio
        z, (c1, c2, c3) = ndtri(probability), self.expansion
        mean_of_tail = self.location - self.scale * (c1 + z * c2 + (z * z - 1) * c3) / mills_ratio(-z)
        return -mean_of_tail

    def log_growth(self) -> LogGrowth:
        return log_growth_of_point(self.location, self.scale)

    def total_loss_probability(self) -> Numbers:
        return self.probability_at_most(number(-1))


class ExponentialCornishFisherLaw(CornishFisherLaw):
    """log(1 + R) = location + scale w(Z); E[R] is infinite unless w is a straight line or the scale is 0."""

    def _distance(self, threshold: Numbers) -> Numbers:
        return log_growth_factor(threshold) - self.location

    def _closeness(self, threshold: Numbers) -> Numbers:
        return np.full(np.shape(threshold), COINCIDENCE)

    def _finite(self) -> Truths:
        return np.asarray((self.scale == 0) | (self.expansion.c3 == 0))

    def mean(self) -> Numbers:
        return np.where(self._finite(), np.expm1(self.location + self.scale**2 / 2), INFINITY)

    def standard_deviation(self) -> Numbers:
        variance = self.scale**2
        return np.where(self._finite(), np.exp(self.location + variance / 2) * np.sqrt(np.expm1(variance)), INFINITY)

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray((self.scale == 0) | (threshold <= -1))

    def gaps(self, threshold: Numbers) -> Gaps:
        z = self._score(threshold)
        spread = np.isfinite(z)
        first, second = moments_below(
            lambda t, z, scale, *c: -np.expm1(-scale * _fall(t, z, Expansion(*c))),
            np.where(spread, z, 0.0),
            self.scale,
            *self.expansion,
        )
        sure = np.where(z > 0, -np.expm1(-np.where(z > 0, self._distance(threshold), 0.0)), 0.0)
        growth = np.maximum(1 + threshold, 0.0)
        return Gaps(growth * np.where(spread, first, sure), growth * (growth * np.where(spread, second, sure * sure)))

    def quantile(self, probability: Numbers) -> Numbers:
        return np.expm1(super().quantile(probability))

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        quantile = self.quantile(probability)
        return np.where(self._finite(), self.gaps(quantile).order_1 / probability - quantile, NO_VALUE)

    def log_growth(self) -> LogGrowth:
        return LogGrowth(self.location, self.scale * shape_moments(self.expansion)[0])

    def total_loss_probability(self) -> Numbers:
        return np.zeros_like(self.location)


def _fall(t: Numbers, z: Numbers, w: Expansion) -> Numbers:
    """w(z) - w(z - t), as t times a quadratic: exact where the two are close."""
    slope = w.c1 - 3 * w.c3 + 2 * w.c2 * z + 3 * w.c3 * z * z
    return np.maximum(t * (slope - t * (w.c2 + 3 * w.c3 * z) + t * t * w.c3), 0.0)
