"""A return with finitely many possible values."""

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers, Truths
from service.core.returns.law import COINCIDENCE, Atoms, Gaps, HorizonLaw, LogGrowth

LEVEL_TIE = 1e-12
"""A cumulative probability this close to a level is equal to it: 1 - 0.9 is not 0.1 in binary."""


class AtomsLaw(HorizonLaw):
    """R takes `values`, in rising order, and `cumulative` are P(R <= each), ending with 1.

    `moments`: E[R] and sd[R]. `total_loss`: P(R <= -1). `closeness`: a threshold this near to a value, as a share of
    1 or its size, lies on it.
    """

    method = "enumeration"
    discrete = True

    def __init__(
        self,
        values: Numbers,
        cumulative: Numbers,
        moments: tuple[Numbers, Numbers],
        log_growth: LogGrowth,
        total_loss: Numbers,
        closeness: float = COINCIDENCE,
    ) -> None:
        self.values = values
        self.numerical_error = 1e-13 + 1e-15 * float(np.sqrt(values.size))
        self._cumulative: Numbers = np.concatenate([[0.0], cumulative])
        self._moments = moments
        self._log_growth = log_growth
        self._total_loss = total_loss
        self._closeness = closeness
        steps = np.diff(values)
        # the gap is piecewise linear in the threshold: its values at the atoms, from positive terms alone
        self._gap_at = np.concatenate([[0.0], np.cumsum(cumulative[:-1] * steps)])
        squares = (2 * self._gap_at[:-1] + cumulative[:-1] * steps) * steps
        self._square_gap_at = np.concatenate([[0.0], np.cumsum(squares)])

    def mean(self) -> Numbers:
        return self._moments[0]

    def standard_deviation(self) -> Numbers:
        return self._moments[1]

    def _count(self, threshold: Numbers, side: int) -> npt.NDArray[np.intp]:
        """Values below the threshold (side -1), or at most it (side 1); near ones count as equal to it."""
        edge = threshold + side * self._closeness * (1 + np.abs(threshold))
        return np.searchsorted(self.values, edge, side="right" if side > 0 else "left")

    def probability_below(self, threshold: Numbers) -> Numbers:
        return self._cumulative[self._count(threshold, -1)]

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return self._cumulative[self._count(threshold, 1)]

    def certain(self, threshold: Numbers) -> Truths:
        below = self._count(threshold, -1)
        return np.asarray((below == 0) | (below == self.values.size))

    def gaps(self, threshold: Numbers) -> Gaps:
        below = self._count(threshold, -1)
        last = np.maximum(below - 1, 0)
        beyond = threshold - self.values[last]
        share = self._cumulative[below]
        gap, square_gap = self._gap_at[last], self._square_gap_at[last]
        some = below > 0
        return Gaps(
            np.where(some, gap + share * beyond, 0.0),
            np.where(some, square_gap + (2 * gap + share * beyond) * beyond, 0.0),
        )

    def quantile(self, probability: Numbers) -> Numbers:
        return self._at_place(np.searchsorted(self._cumulative[1:], probability - LEVEL_TIE, side="left"))

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._at_place(np.searchsorted(self._cumulative[1:], probability + LEVEL_TIE, side="right"))

    def _at_place(self, place: npt.NDArray[np.intp]) -> Numbers:
        return self.values[np.minimum(place, self.values.size - 1)]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # any quantile serves: E[max(q - R, 0)]/a - q
        quantile = self.upper_quantile(probability)
        return self.gaps(quantile).order_1 / probability - quantile

    def log_growth(self) -> LogGrowth:
        return self._log_growth

    def total_loss_probability(self) -> Numbers:
        return self._total_loss

    def atoms(self) -> Atoms:
        return Atoms(self.values, self._cumulative[1:])
