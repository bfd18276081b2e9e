"""Growth with too many outcomes to list, by two halves of the periods that are listed each."""

from collections.abc import Callable
from functools import cached_property

import numpy as np

from service.core.arrays import Numbers, Truths, number
from service.core.returns.compounding.compositions import compositions
from service.core.returns.compounding.growth import Growth
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, log_growth_factor
from service.core.returns.laws.atoms import LEVEL_TIE
from service.core.returns.search import first_reaching
from service.core.returns.work import thresholds_beyond

MOST_IN_HALF = 40_000
MOST_EXACT_QUANTILES = 16
MOST_PAIRS = 5e7
"""Outcomes of one half looked up in the other, for one question."""
BLOCK = 2_000_000
WORK_OF_OUTCOME = 2e3
"""Multiplications that its quantiles take for each outcome of a half."""


class HalvesLaw(HorizonLaw):
    """log(1 + R) = A + B, A and B independent sums of the same values, each over half of the periods.

    P(R < t) is the sum over the outcomes of A of P(B < log(1 + t) - A), by one sorted search; the gaps likewise with
    cumulative sums of exp(B) and exp(2 B). Exact for up to a thousand million outcomes. Quantiles are searched on these
    sums; more than 16 at once come from the law that `smooth` makes, which approximates this one.
    """

    method = "two_halves"
    discrete = True

    def __init__(
        self, values: Numbers, masses: Numbers, one: Growth, periods: int, smooth: Callable[[], HorizonLaw]
    ) -> None:
        self._alive = masses.sum() ** periods
        self._one, self._periods = one, number(periods)
        self._make_smooth = smooth
        shares = masses / masses.sum()
        p, (x,) = compositions(periods - periods // 2, shares, [values])
        q, (y,) = (p, (x,)) if periods % 2 == 0 else compositions(periods // 2, shares, [values])
        order = np.argsort(x)[::-1]
        self._a, self._p = x[order], p[order]  # falling, so that what is searched for rises
        order = np.argsort(y)
        self._b = y[order]
        powers = [q[order] * np.exp(k * self._b) for k in range(3)]
        self._sums = np.array([np.concatenate([[0.0], np.cumsum(power)]) for power in powers])
        self._growth = np.exp(self._a)
        self._ends = number(self._a[-1] + self._b[0]), number(self._a[0] + self._b[-1])
        self._closeness = COINCIDENCE * (1 + periods * float(np.abs(values).max()))
        self.cautions = one.cautions(self._periods)
        self.work = WORK_OF_OUTCOME * self._a.size
        self.numerical_error = 1e-14 * periods + 1e-15 * float(np.sqrt(x.size))

    @cached_property
    def _smooth(self) -> HorizonLaw:
        return self._make_smooth()

    def _partial_moments(self, log_growth: Numbers, side: int) -> Numbers:
        """E[(1 + R)^k; 0 < 1 + R below the growth] for k = 0, 1, 2, along a new first axis; `side` 1: at most it."""
        edges = log_growth + side * self._closeness * (1 + np.abs(log_growth))
        found = np.empty((3, edges.size))
        for start in range(0, edges.size, max(1, BLOCK // self._a.size)):
            i = slice(start, start + max(1, BLOCK // self._a.size))
            place = np.searchsorted(self._b, edges[i, np.newaxis] - self._a)
            for k in range(3):
                found[k, i] = self._sums[k][place] @ (self._p * self._growth**k)
        return np.asarray(self._alive * found)

    def _at(self, threshold: Numbers, side: int) -> tuple[Numbers, Numbers]:
        """Give the partial moments below the threshold, of its shape, and the probability of a total loss below it."""
        flat = np.ravel(threshold)
        if flat.size * self._a.size > MOST_PAIRS:
            raise thresholds_beyond(flat.size, int(MOST_PAIRS) // self._a.size)
        found = np.zeros((3, flat.size))
        above = np.flatnonzero(flat > -1)
        found[:, above] = self._partial_moments(log_growth_factor(flat[above]), side)
        lost = np.where(flat >= -1 if side > 0 else flat > -1, self._one.total_loss(self._periods), 0.0)
        shape = np.shape(threshold)
        return found.reshape(3, *shape), lost.reshape(shape)

    def mean(self) -> Numbers:
        return self._one.moments(self._periods)[0]

    def standard_deviation(self) -> Numbers:
        return self._one.moments(self._periods)[1]

    def probability_below(self, threshold: Numbers) -> Numbers:
        found, lost = self._at(threshold, -1)
        return np.asarray(np.minimum(found[0] + lost, 1.0))[()]

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        found, lost = self._at(threshold, 1)
        return np.asarray(np.minimum(found[0] + lost, 1.0))[()]

    def certain(self, threshold: Numbers) -> Truths:
        low, high = (np.expm1(end) for end in self._ends)
        margin = 2 * self._closeness * (1 + np.abs(threshold))
        nothing = threshold < low - margin if self._one.zero_probability == 0 else threshold <= -1
        return np.asarray(nothing | (threshold > high + margin))

    def gaps(self, threshold: Numbers) -> Gaps:
        (none, once, twice), lost = self._at(threshold, -1)
        growth = np.maximum(1 + threshold, 0.0)
        first = np.maximum(growth * none - once, 0.0) + growth * lost
        second = np.maximum(growth * growth * none - 2 * growth * once + twice, 0.0) + growth * growth * lost
        return Gaps(first, second)

    def quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, probability - LEVEL_TIE)

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, probability + LEVEL_TIE)

    def _reaching(self, probability: Numbers, level: Numbers) -> Numbers:
        if np.size(level) > MOST_EXACT_QUANTILES:
            return self._smooth.quantile(probability)
        lost = self._one.total_loss(self._periods)
        targets = (np.ravel(level) - lost) / self._alive
        low, high = (np.full(targets.shape, end) for end in self._ends)
        margin = 1e-9
        reached = first_reaching(
            lambda y: self._partial_moments(y, 1)[0] / self._alive - targets, low - margin, high + margin
        )
        found = np.where(targets > 0, np.expm1(reached), np.where(lost > 0, -1.0, np.expm1(self._ends[0])))
        return found.reshape(np.shape(probability))[()]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # any quantile serves: E[max(q - R, 0)]/a - q
        quantile = self.upper_quantile(probability)
        return self.gaps(quantile).order_1 / probability - quantile

    def log_growth(self) -> LogGrowth:
        return self._one.log_moments(self._periods)

    def total_loss_probability(self) -> Numbers:
        return self._one.total_loss(self._periods)
