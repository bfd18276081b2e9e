"""Growth whose logarithm is normal: between cash flows only its mean and variance matter."""

from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np

from service.core.arrays import Numbers, Truths
from service.core.goals.course import COARSER, RATIO
from service.core.goals.points import Points, Spread

CERTAIN = 1e-8
"""A deviation of the log growth over a step that is taken as none."""
NEGLIGIBLE = 1e-17


@dataclass(frozen=True)
class NormalGrowth:
    """Log growth between each date and the next: independent N(means[i], variances[i])."""

    method: ClassVar[str] = "lognormal_mixture_quadrature"
    error_share: ClassVar[float] = 10 * float(np.exp(-np.square(np.pi * RATIO) * (1 - COARSER**-2)))
    """The rule's error falls as exp(-pi^2 r^2); ten times what that makes of the difference."""

    discrete: ClassVar[bool] = False

    means: Numbers
    variances: Numbers

    @cached_property
    def error_floor(self) -> float:
        """Rounding of places whose distance is a small part of them, measured, with room."""
        random = self.random
        least = np.sqrt(self.variances[random].min(initial=1.0))
        return max(1e-11, 1e-16 * float(np.sqrt(random.sum()) / least))

    @cached_property
    def random(self) -> Truths:
        """Whether growth from each date to the next is uncertain."""
        return self.variances > CERTAIN**2

    @property
    def certain(self) -> Numbers:
        """Log growth where it is certain."""
        return self.means

    @cached_property
    def log_factors(self) -> Numbers:
        """Logarithm of E[G]."""
        return self.means + self.variances / 2

    @cached_property
    def survival(self) -> Numbers:
        """P(G > 0) of each."""
        return np.ones(self.means.size)

    def spread(self, points: Points, shift: float, start: int, end: int) -> Spread:
        """Give the law of wealth at date `end`, before its flow, from the points after the flow at `start`."""
        return Spread(points, shift + self.drift(start, end), self.deviation(start, end))

    def drift(self, start: int, end: int) -> float:
        """Give the mean of log growth between two dates."""
        return float(self.means[start:end].sum())

    def deviation(self, start: int, end: int) -> float:
        """Give the deviation of log growth between two dates."""
        return float(np.sqrt(self.variances[start:end].sum()))

    def spacing(self, spread: Spread, start: int, end: int, ratio: float) -> float:
        """Distance of the points after the flow at `start`: `ratio` of them a deviation, before it and until `end`."""
        wanted = min(spread.deviation, self.deviation(start, end)) / ratio
        known = spread.points.spacing
        return known if abs(wanted / known - 1) < 1e-9 else wanted

    def trimmed(self, points: Points) -> Points:
        """Leave out the ends whose mass is lost in rounding."""
        (kept,) = (points.masses > NEGLIGIBLE).nonzero()
        if kept.size == 0:
            return Points(points.spacing, points.first, np.zeros(0), points.rest)
        first, end = int(kept[0]), int(kept[-1]) + 1
        return Points(points.spacing, points.first + first, points.masses[first:end], points.rest)
