"""Wealth just after a cash flow as weighted points, and just before the next one as a mixture around them."""

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from service.core.arrays import Numbers

FAR = 8.5
"""What lies farther than so many deviations is certain, to 1e-17."""


@dataclass(frozen=True, slots=True)
class Points:
    """Wealth rest + exp(x) with probability masses[i] at x = spacing (first + i), in a unit that `Spread` holds.

    rest = 0: just after a withdrawal, the points are even in log wealth. rest = 1: just after money came in.
    """

    spacing: float
    first: int
    masses: Numbers
    rest: float = 0.0

    def log_wealth(self) -> Numbers:
        """Give the logarithm of wealth at each point."""
        return self.log_wealth_from(self.first, self.masses.size)

    def log_wealth_from(self, first: int, count: int) -> Numbers:
        """Give the same for any stretch of the points."""
        x = self.spacing * np.arange(first, first + count, dtype=np.float64)
        return np.logaddexp(np.log(self.rest), x) if self.rest > 0 else x


def single(wealth: float) -> tuple[Points, float]:
    """Give all mass in one place: the point, and the logarithm of its unit."""
    return Points(1.0, 0, np.ones(1)), float(np.log(wealth))


@dataclass(frozen=True, slots=True)
class Spread:
    """ln V = log wealth of a point + shift + deviation Z, Z standard normal: the law of V, where it is above zero."""

    points: Points
    shift: float
    deviation: float

    def log_centres(self) -> Numbers:
        """Centres of ln V, rising."""
        return self.points.log_wealth() + self.shift

    def probability_at_least(self, level: float) -> float:
        """P(V >= level), level > 0: sum of p Phi((centre - ln level)/deviation)."""
        return at_least(self.log_centres(), self.points.masses, self.deviation, level)

    def shortfall(self, level: float) -> float:
        """E[max(level - V, 0)] over V > 0 alone, level > 0."""
        return shortfall(self.log_centres(), self.points.masses, self.deviation, level)


def at_least(centres: Numbers, masses: Numbers, deviation: float, level: float) -> float:
    """P(V >= level) of a mixture of lognormal laws, `centres` rising."""
    low, high = np.searchsorted(centres, np.log(level) + np.array([-FAR, FAR]) * deviation)
    near = masses[low:high] @ ndtr((centres[low:high] - np.log(level)) / deviation)
    return float(near + masses[high:].sum())


def shortfall(centres: Numbers, masses: Numbers, deviation: float, level: float) -> float:
    """E[max(level - V, 0)] of a mixture of lognormal laws: sum of p [K Phi(d) - e^(c + s^2/2) Phi(d - s)].

    d = (ln K - c)/s, c and s centre and deviation (Black & Scholes 1973 for the formula). `centres` rise.
    """
    low = int(np.searchsorted(centres, np.log(level) + FAR * deviation))
    centres, masses = centres[:low], masses[:low]
    d = (np.log(level) - centres) / deviation
    growth = np.exp(centres + (deviation * deviation / 2 - np.log(level)))
    return level * float(masses @ (ndtr(d) - growth * ndtr(d - deviation)))
