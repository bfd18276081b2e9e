"""A return that is one of equally likely observations."""

from functools import cached_property

import numpy as np
import numpy.typing as npt

from service.core.arrays import NO_VALUE, Numbers, Truths, number
from service.core.distributions.family import Moments
from service.core.returns.law import COINCIDENCE, Atoms, Gaps, HorizonLaw, LogGrowth

LEVEL_TIE = 1e-12
"""A cumulative probability this close to a level is equal to it: 1 - 0.9 is not 0.1 in binary."""


class SampleLaw(HorizonLaw):
    """R takes each of the given values, a flat array, with the same probability."""

    method = "counting"
    numerical_error = 1e-14

    def __init__(self, values: Numbers) -> None:
        self.values: Numbers = np.sort(values)
        self.count = self.values.size
        share = np.arange(1, self.count) / self.count
        steps = np.diff(self.values)
        # the gap is piecewise linear in the threshold: its values at the observations, from positive terms alone
        self._gap_at = np.concatenate([[0.0], np.cumsum(share * steps)])
        squares = (2 * self._gap_at[:-1] + share * steps) * steps
        self._square_gap_at = np.concatenate([[0.0], np.cumsum(squares)])

    @cached_property
    def _moments(self) -> Moments:
        return sample_moments(self.values)

    def mean(self) -> Numbers:
        return self._moments.mean

    def standard_deviation(self) -> Numbers:
        return self._moments.standard_deviation

    def _count(self, threshold: Numbers, side: int) -> npt.NDArray[np.intp]:
        """Observations below the threshold (side -1), or at most it (side 1); near ones count as equal to it."""
        edge = threshold + side * COINCIDENCE * (1 + np.abs(threshold))
        return np.searchsorted(self.values, edge, side="right" if side > 0 else "left")

    def probability_below(self, threshold: Numbers) -> Numbers:
        return self._count(threshold, -1) / self.count

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return self._count(threshold, 1) / self.count

    def certain(self, threshold: Numbers) -> Truths:
        return np.full(np.shape(threshold), True)

    def gaps(self, threshold: Numbers) -> Gaps:
        below = self._count(threshold, -1)
        last = np.maximum(below - 1, 0)
        beyond = threshold - self.values[last]
        share = below / self.count
        gap, square_gap = self._gap_at[last], self._square_gap_at[last]
        some = below > 0
        return Gaps(
            np.where(some, gap + share * beyond, 0.0),
            np.where(some, square_gap + (2 * gap + share * beyond) * beyond, 0.0),
        )

    def quantile(self, probability: Numbers) -> Numbers:
        return self._at_place(np.ceil(self.count * (probability - LEVEL_TIE)))

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._at_place(np.floor(self.count * (probability + LEVEL_TIE)) + 1)

    def _at_place(self, place: Numbers) -> Numbers:
        return self.values[np.clip(place, 1, self.count).astype(np.intp) - 1]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # any quantile serves: E[max(q - R, 0)]/a - q
        quantile = self.upper_quantile(probability)
        return self.gaps(quantile).order_1 / probability - quantile

    def log_growth(self) -> LogGrowth:
        if self.values[0] <= -1:
            return LogGrowth(NO_VALUE, NO_VALUE)
        moments = sample_moments(np.log1p(self.values))
        return LogGrowth(moments.mean, moments.standard_deviation)

    def total_loss_probability(self) -> Numbers:
        return self.probability_at_most(number(-1))

    def atoms(self) -> Atoms:
        return Atoms(self.values, np.arange(1, self.count + 1) / self.count)


def sample_moments(values: Numbers) -> Moments:
    """Moments of the law that takes each value with the same probability: divisor n. Skewness of a constant is nan."""
    # a power of two as unit: scaling is exact, and no square leaves the doubles
    unit = np.ldexp(1.0, np.frexp(np.abs(values).max())[1])
    scaled = values / unit
    rough = scaled.mean()
    shift = (scaled - rough).mean()
    centred = (scaled - rough) - shift
    variance = np.square(centred).mean()
    if values.min() == values.max():
        return Moments(number(values[0]), number(0), NO_VALUE, NO_VALUE)
    deviation = np.sqrt(variance)
    z = centred / deviation
    square = z * z
    return Moments(unit * (rough + shift), unit * deviation, (square * z).mean(), (square * square).mean() - 3)
