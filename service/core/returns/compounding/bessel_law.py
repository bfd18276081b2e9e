"""The law of the growth over n periods whose log returns have Student's t."""

import numpy as np

from service.core.arrays import INFINITY, NO_VALUE, Numbers, Truths, number
from service.core.returns.compounding.compound import refuse_periods
from service.core.returns.compounding.grid import kernels
from service.core.returns.compounding.power_tails import PowerTails
from service.core.returns.compounding.student_t_transform import t_transform
from service.core.returns.compounding.trigonometric_sums import series
from service.core.returns.law import Gaps, HorizonLaw, LogGrowth, log_growth_factor
from service.core.returns.search import first_reaching
from service.core.returns.work import OF_A_LAW, thresholds_beyond

RESOLVED = 1e-15
MOST_TERMS = 3e8
WORK_OF_GRID = 8.0
HEAVY_BELOW = 30.0
"""Degrees of freedom below which the tails fall so slowly that the period is 400 standard deviations."""
LEAST_PERIOD = 60.0
"""The kernels of the gaps fall like exp(-k)."""
OTHER_STRETCH = 1.31
COMPARED_AT = np.concatenate([-np.geomspace(30, 0.05, 24), [0.0], np.geomspace(0.05, 30, 24)])


class BesselGrid:
    """g_j(k) = E[max(1 - exp(L - k), 0)^j], j = 0, 1, 2, for the sum L of n periods about its mean.

    As in `Grid`, but with the known transform and about the exact mean; the aliases of tails that fall like a power are
    visible and taken off (see `PowerTails`).
    """

    def __init__(
        self, degrees_of_freedom: Numbers, scale: Numbers, deviation: float, periods: int, stretch: float
    ) -> None:
        heavy = degrees_of_freedom < HEAVY_BELOW
        width = 400 * max(deviation, 0.02) if heavy else 24 * deviation + 10
        self.period = stretch * max(width, LEAST_PERIOD)
        self.step = 2 * np.pi / self.period
        highest = 8.5 / deviation
        while t_transform(degrees_of_freedom, np.array([highest * scale]))[0] ** periods > RESOLVED:
            highest *= 1.3
        count = int(highest * stretch / self.step)
        frequencies: Numbers = (np.arange(float(count)) + 0.5) * self.step
        powers = t_transform(degrees_of_freedom, frequencies * scale) ** periods
        self.coefficients = self.step / np.pi * powers * kernels(frequencies)
        self.tails = PowerTails(degrees_of_freedom, scale, periods, self.period)

    def relative_gaps(self, k: Numbers) -> Numbers:
        """g_0, g_1, g_2 at k, along a new first axis; k is flat. Beyond half the period from the tails alone."""
        inside = np.clip(k, -self.period / 2, self.period / 2)
        found = 0.5 + series(inside, self.coefficients, self.step) - self.tails.aliases(inside)
        below, above = k < -self.period / 2, k > self.period / 2
        if below.any():
            found[:, below] = self.tails.beyond(-k[below], side=-1)
        if above.any():
            found[:, above] = 1 - self.tails.beyond(k[above], side=1)
        return np.clip(found, 0.0, 1.0)


class BesselLaw(HorizonLaw):
    """log(1 + R) is the sum of n independent location + scale T, T standard Student t; E[R] is infinite.

    The stated error is three times the difference of two grids over thirty standard deviations, 1e-13, and for each
    period the 1e-14 of its transform; that of
    probabilities and of gaps as a share of the growth factor.
    """

    method = "fourier_inversion"
    numerical_error_kind = "estimate"

    def __init__(
        self, degrees_of_freedom: Numbers, location: Numbers, scale: Numbers, deviation: Numbers, periods: int
    ) -> None:
        refuse_periods(periods)
        self._mean = periods * location
        self._deviation = np.sqrt(number(periods)) * deviation
        spread = float(self._deviation)
        grids = [BesselGrid(degrees_of_freedom, scale, spread, periods, stretch) for stretch in (1.0, OTHER_STRETCH)]
        self._grid = grids[0]
        self.work = WORK_OF_GRID * OF_A_LAW
        first, second = (grid.relative_gaps(spread * COMPARED_AT) for grid in grids)
        self.numerical_error = 3 * float(np.abs(first - second).max()) + 1e-13 + 1e-14 * periods

    def mean(self) -> Numbers:
        return INFINITY

    def standard_deviation(self) -> Numbers:
        return INFINITY

    def _relative_gaps(self, threshold: Numbers) -> Numbers:
        flat = np.ravel(threshold)
        count = self._grid.coefficients.shape[1]
        if flat.size * count > MOST_TERMS:
            raise thresholds_beyond(flat.size, int(MOST_TERMS) // count)
        found = np.zeros((3, flat.size))
        above = np.flatnonzero(flat > -1)
        found[:, above] = self._grid.relative_gaps(log_growth_factor(flat[above]) - self._mean)
        return found.reshape(3, *np.shape(threshold))

    def probability_below(self, threshold: Numbers) -> Numbers:
        below: Numbers = self._relative_gaps(threshold)[0]
        return below[()]

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return self.probability_below(threshold)

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(threshold <= -1)

    def gaps(self, threshold: Numbers) -> Gaps:
        _, first, second = self._relative_gaps(threshold)
        growth = np.maximum(1 + threshold, 0.0)
        return Gaps(growth * first, growth * (growth * second))

    def quantile(self, probability: Numbers) -> Numbers:
        levels = np.ravel(probability)
        far = self._grid.tails.farthest(np.minimum(levels, 1 - levels).min(initial=0.5))
        ends = np.full(levels.shape, max(far, 40 * float(self._deviation)))
        reached = first_reaching(lambda k: self._grid.relative_gaps(k)[0] - levels, -ends, ends)
        found: Numbers = np.expm1(reached + self._mean)
        return found.reshape(np.shape(probability))[()]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        return np.full(np.shape(probability), NO_VALUE)[()]

    def log_growth(self) -> LogGrowth:
        return LogGrowth(self._mean, self._deviation)

    def total_loss_probability(self) -> Numbers:
        return number(0)
