"""Moments of the growth over many periods, from those of one factor."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.distributions.family import Moments
from service.core.returns.law import HorizonLaw, LogGrowth
from service.core.returns.laws.lognormal import growth_moments
from service.core.returns.mixed_moments import mixed_moments

NOTICEABLE_LOSS = 1e-12
UNKNOWN = LogGrowth(NO_VALUE, NO_VALUE)


@dataclass(frozen=True, slots=True)
class Growth:
    """One growth factor G = max(1 + Y, 0) or exp(Y): what its powers need; single numbers."""

    log_mean: Numbers
    """log E[G]."""
    relative_variance: Numbers
    """Variance of G over the square of its mean."""
    zero_probability: Numbers
    """P(G = 0)."""
    log_growth: LogGrowth = UNKNOWN
    """Mean and standard deviation of log G; nan where G = 0 is possible."""

    def moments(self, periods: Numbers) -> tuple[Numbers, Numbers]:
        """E[R] and sd[R] of R = G_1 ... G_n - 1: (1 + E[R])^2 and E[(1 + R)^2] are powers of those of one factor."""
        return growth_moments(periods * self.log_mean, periods * np.log1p(self.relative_variance))

    def log_moments(self, periods: Numbers) -> LogGrowth:
        """Mean and standard deviation of log(1 + R)."""
        mean, deviation = self.log_growth
        return LogGrowth(periods * mean, np.sqrt(periods) * deviation)

    def total_loss(self, periods: Numbers) -> Numbers:
        """P(R = -1), to full relative accuracy."""
        return -np.expm1(periods * np.log1p(-self.zero_probability))

    def cautions(self, periods: Numbers) -> tuple[str, ...]:
        """Say that several periods were computed with total losses that are final."""
        return ("growth_below_zero",) if periods > 1 and self.total_loss(periods) > NOTICEABLE_LOSS else ()


def floored(one_period: HorizonLaw, mirrored: HorizonLaw) -> Growth:
    """Give the growth max(1 + R, 0) for a law of one period, R; `mirrored` is the law of -R.

    With a mean above -1 from the gaps below a total loss, which are small corrections; else as the gaps of the mirrored
    law below +1, which are E[G] and E[G^2] themselves. Error 1e-13 relative.
    """
    mean, deviation = one_period.mean(), one_period.standard_deviation()
    zero_probability = one_period.total_loss_probability()
    if mean > -1:
        gap, square_gap = one_period.gaps(number(-1))
        growth = 1 + mean + gap
        variance = deviation * deviation - square_gap - gap * (2 * (1 + mean) + gap)
        return Growth(np.log1p(mean + gap), np.maximum(variance, 0) / growth**2, zero_probability)
    growth, square = mirrored.gaps(number(1))
    some = growth > 0
    return Growth(np.log(growth), np.where(some, square / growth**2 - 1, 0.0)[()], zero_probability)


def growth_of_values(logs: Numbers, masses: Numbers) -> Growth:
    """Growth by a factor that takes finitely many values, from their logarithms (-inf: a total loss)."""
    possible = masses > 0
    logs, masses = logs[possible], masses[possible]
    none = np.zeros_like(logs)
    mean, deviation, _, _ = mixed_moments(masses, Moments(np.expm1(logs), none, none, none))
    log_growth = UNKNOWN
    alive = np.isfinite(logs)
    if alive.all():
        log_growth = LogGrowth(*mixed_moments(masses, Moments(logs, none, none, none))[:2])
    relative = np.where(mean > -1, (deviation / (1 + mean)) ** 2, 0.0)[()]
    return Growth(np.log1p(mean), relative, masses[~alive].sum(), log_growth)
