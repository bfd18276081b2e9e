"""What is best of the frontier: three objectives, each one sign change of a criterion along it.

With m = mu'w, s^2 = w'Aw and lam the appetite for return at which w lies on the frontier:
safety_first_ratio (Roy 1952) maximises (m - floor)/s, where lam (m - floor) = s^2; quantile_return (Kataoka 1963)
maximises m - z s, where lam z = s; expected_return (Telser 1955) takes the greatest m with m - z s >= floor, where
m - z s = floor beyond Kataoka's lam, or the end of the frontier.
"""

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from service.core.arrays import Numbers
from service.core.portfolio.allocation.frontier import Piece


@dataclass(frozen=True, slots=True)
class Line:
    """Mean and variance of the mixes on a piece: m0 + m1 lam and s0 + s1 lam + s2 lam^2."""

    m0: float
    m1: float
    s0: float
    s1: float
    s2: float

    @classmethod
    def of(cls, piece: Piece, means: Numbers, risk: Numbers) -> "Line":
        """Give the line of a piece."""
        constant, slope = piece.constant, piece.slope
        return cls(
            float(means @ constant),
            float(means @ slope),
            float(constant @ risk @ constant),
            2 * float(constant @ risk @ slope),
            float(slope @ risk @ slope),
        )

    def mean(self, lam: float) -> float:
        """Mean of the mix at lam."""
        return self.m0 + self.m1 * lam

    def variance(self, lam: float) -> float:
        """Variance of the mix at lam."""
        return max(self.s0 + self.s1 * lam + self.s2 * lam * lam, 0.0)


@dataclass(frozen=True, slots=True)
class Objective:
    """One way to be best, for a floor of one period and z standard deviations from the mean to the quantile.

    `criterion` rises through 0 at the optimum along the frontier.
    """

    floor: float
    z: float

    name: ClassVar[str]
    meaning: ClassVar[str]

    def criterion(self, lam: float, line: Line) -> float:
        """Give the criterion at lam."""
        raise NotImplementedError

    def quadratic(self, line: Line) -> tuple[float, float, float]:
        """Give coefficients whose real roots hold the optimum of a piece."""
        raise NotImplementedError

    def next_guess(self, mean: float, variance: float) -> float | None:
        """Give lam to look at next, after a mix with this mean and variance."""
        raise NotImplementedError

    def gradient(self, means: Numbers, pull: Numbers, mean: float, deviation: float, lam: float) -> Numbers:
        """Give the gradient of what is maximised, at a mix w with pull = covariance w."""
        raise NotImplementedError

    def roots(self, line: Line) -> list[float]:
        """Give the real roots of the quadratic of a piece."""
        return real_roots(*self.quadratic(line))


class SafestRatio(Objective):
    """Roy."""

    name = "safety_first_ratio"
    meaning = "the greatest (expected return - floor) / volatility (Roy 1952)"

    def criterion(self, lam: float, line: Line) -> float:
        return lam * (line.mean(lam) - self.floor) - line.variance(lam)

    def quadratic(self, line: Line) -> tuple[float, float, float]:
        return line.s2 - line.m1, line.s1 - line.m0 + self.floor, line.s0

    def next_guess(self, mean: float, variance: float) -> float | None:
        return variance / (mean - self.floor) if mean > self.floor else None

    def gradient(self, means: Numbers, pull: Numbers, mean: float, deviation: float, lam: float) -> Numbers:  # noqa: ARG002
        return means / deviation - (mean - self.floor) * pull / deviation**3 if deviation > 0 else means


class BestQuantile(Objective):
    """Kataoka."""

    name = "quantile_return"
    meaning = "the greatest return that is missed only with quantile_probability (Kataoka 1963)"

    def criterion(self, lam: float, line: Line) -> float:
        return lam * self.z - math.sqrt(line.variance(lam))

    def quadratic(self, line: Line) -> tuple[float, float, float]:
        return line.s2 - self.z**2, line.s1, line.s0

    def next_guess(self, mean: float, variance: float) -> float | None:  # noqa: ARG002
        return math.sqrt(variance) / self.z

    def gradient(self, means: Numbers, pull: Numbers, mean: float, deviation: float, lam: float) -> Numbers:  # noqa: ARG002
        return means - self.z * pull / deviation if deviation > 0 else means


class MostReturn(Objective):
    """Telser."""

    name = "expected_return"
    meaning = "the greatest expected return within the limit on missing the floor (Telser 1955)"

    def criterion(self, lam: float, line: Line) -> float:
        return self.floor - (line.mean(lam) - self.z * math.sqrt(line.variance(lam)))

    def quadratic(self, line: Line) -> tuple[float, float, float]:
        distance, square = line.m0 - self.floor, self.z**2
        return line.m1**2 - square * line.s2, 2 * line.m1 * distance - square * line.s1, distance**2 - square * line.s0

    def next_guess(self, mean: float, variance: float) -> float | None:  # noqa: ARG002
        return None

    def gradient(self, means: Numbers, pull: Numbers, mean: float, deviation: float, lam: float) -> Numbers:  # noqa: ARG002
        # the limit's multiplier k = 1/(lam z/s - 1) turns mu + k (mu - z Sw/s) into (1 + k) (mu - Sw/lam);
        # at the end of the frontier, lam infinite, the limit does not bind
        return means - pull / lam


OBJECTIVES = {objective.name: objective for objective in (SafestRatio, BestQuantile, MostReturn)}


def real_roots(a: float, b: float, c: float) -> list[float]:
    """Give the real roots of a x^2 + b x + c, by the form that does not cancel; a double root may miss by rounding."""
    discriminant = b * b - 4 * a * c
    if -1e-12 * b * b <= discriminant < 0:
        discriminant = 0.0
    if discriminant < 0 or a == b == c == 0:
        return []
    q = -0.5 * (b + math.copysign(math.sqrt(discriminant), b))
    return ([c / q] if q != 0 else []) + ([q / a] if a != 0 else [])


def misdirection(gradient: Numbers, weights: Numbers, least: Numbers, most: Numbers) -> float:
    """Largest violation of stationarity of a maximum, at the best multiplier of the sum of the weights.

    What may grow must gain at most eta, what may shrink at least eta: half of what the greatest of the first exceeds
    the least of the second by.
    """
    gain = gradient[weights < most].max(initial=-np.inf)
    loss = gradient[weights > least].min(initial=np.inf)
    return max(0.0, float(gain - loss) / 2)
