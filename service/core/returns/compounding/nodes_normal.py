"""Log growth by a normal return, or by a Cornish-Fisher transformation of one."""

from functools import cached_property

import numpy as np
from scipy.special import ndtr

from service.core.arrays import Numbers, number
from service.core.distributions.kernels.cornish_fisher import Expansion, inverse
from service.core.returns.compounding.step import Part, evenly
from service.core.returns.mills import normal_density

STRAIGHT = Expansion.of(number(0), number(0))
"""The expansion that is Z itself."""
FARTHEST = 8.6
"""Beyond so many standard deviations the normal law holds less than 1e-17."""
NEAR_LOSS = -9.2
"""Where G = 0 lies within so many standard deviations, the logarithm bends the law of X."""
LEFT_END = -40.0
FLATTEST = 0.1
"""Slope below which the density peaks too narrowly for even steps."""


class NormalPart(Part):
    """Y = mean + deviation w(Z) with deviation > 0; X = log(1 + Y) where that has a value, or Y itself.

    The rule runs over z; where 1 + Y reaches 0 at z0 within 9.2 standard deviations, over t with
    z = z0 + log(1 + exp(t)), and 1 + Y = deviation (z - z0) q(z) with the quadratic q divided out by hand, so that
    nothing cancels.
    """

    def __init__(
        self,
        mean: Numbers,
        deviation: Numbers,
        expansion: Expansion = STRAIGHT,
        weight: float = 1.0,
        simple: bool = True,
    ) -> None:
        self.mean, self.deviation, self.expansion, self.weight, self.simple = mean, deviation, expansion, weight, simple
        self._loss_at = inverse(-(1 + mean) / deviation, expansion) if simple else number(-np.inf)

    @cached_property
    def smooth(self) -> bool:  # type: ignore[override]  # a fact of the parameters here
        """Whether the expansion is nowhere so flat that the density has a peak."""
        return bool(self.expansion.slope(np.linspace(-FARTHEST, FARTHEST, 87)).min() > FLATTEST)

    def density(self, x: Numbers) -> Numbers:
        y = np.expm1(x) if self.simple else x
        z = inverse((y - self.mean) / self.deviation, self.expansion)
        density = self.weight * normal_density(z) / (self.deviation * self.expansion.slope(z))
        return density * np.exp(x) if self.simple else density

    @property
    def zero_probability(self) -> Numbers:
        """P(G = 0), times the weight."""
        return self.weight * ndtr(self._loss_at)

    def nodes(self, highest: float) -> tuple[Numbers, Numbers]:
        if self._loss_at > NEAR_LOSS:
            return self._nodes_near_loss(highest)
        z, distance = evenly(-FARTHEST, FARTHEST, highest * self._steepest(np.linspace(-7.2, 7.2, 73)) + 9.5)
        y = self.mean + self.deviation * self.expansion.value(z)
        weights = self.weight * distance * normal_density(z)
        return (np.log1p(y) if self.simple else y), weights

    def _steepest(self, z: Numbers) -> float:
        """Greatest dX/dz."""
        slope = self.deviation * self.expansion.slope(z)
        if self.simple:
            slope = slope / np.maximum(1 + self.mean + self.deviation * self.expansion.value(z), 1e-300)
        return float(slope.max())

    def _nodes_near_loss(self, highest: float) -> tuple[Numbers, Numbers]:
        last = max(FARTHEST - float(self._loss_at), 2.0)
        t = np.linspace(-30, last, 200)
        z, x = self._from_loss(t)
        rise = np.diff(x) / np.diff(t)
        noticeable = np.exp(-np.minimum(z * z, 1400) / 2)[1:] > 1e-12
        t, distance = evenly(LEFT_END, last, highest * max(1.0, float(rise[noticeable].max(initial=0.0))) + 13)
        z, x = self._from_loss(t)
        return x, self.weight * distance * normal_density(z) / (1 + np.exp(-t))

    def _from_loss(self, t: Numbers) -> tuple[Numbers, Numbers]:
        beyond = np.logaddexp(0, t)
        z0, (_, c2, c3) = self._loss_at, self.expansion
        quotient = self.expansion.slope(z0) + beyond * (c2 + 3 * c3 * z0) + c3 * beyond * beyond
        return z0 + beyond, np.log(self.deviation * quotient) + np.log(beyond)

    def sharp_places(self) -> Numbers:
        _, c2, c3 = self.expansion
        if not c3 > 0:
            return np.zeros(0)
        y = self.mean + self.deviation * self.expansion.value(-c2 / (3 * c3))
        if self.simple and y <= -1:
            return np.zeros(0)
        return np.atleast_1d(np.log1p(y) if self.simple else y)
