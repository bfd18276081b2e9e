"""The empirical distribution of a sample."""

from functools import cached_property

import numpy as np
from scipy.special import entr

from service.core.arrays import NO_VALUE, Numbers
from service.core.distributions.family import Family, Moments, Support, Tails
from service.core.parameters import Sample

TIE = 1e-12


class Empirical(Family):
    """The observations themselves, each as likely as the others: no shape is assumed.

    Counts over the number of observations; moments are those of this law (divided by the number, not one less).
    Error 2 eps, a few eps in the moments; to a quantile, a probability within 1e-12 of an attained one is equal to it.
    """

    name = "empirical"
    discrete = True
    support_words = "the observations"
    method = "counting"
    quantile_method = "counting"
    numerical_error = 4e-15
    observations = Sample("values seen so far", example=[-0.12, 0.03, 0.05, 0.05, 0.11, 0.21])

    @cached_property
    def _sorted(self) -> Numbers:
        return np.sort(self.observations)

    @cached_property
    def _distinct(self) -> tuple[Numbers, Numbers]:
        """Distinct values in rising order, and how often each was seen."""
        values, counts = np.unique(self.observations, return_counts=True)
        return values, counts.astype(np.float64)

    def tails(self, x: Numbers) -> Tails:
        count = self._sorted.size
        below = np.searchsorted(self._sorted, x, side="right")
        return Tails(below / count, (count - below) / count)

    def density(self, x: Numbers) -> Numbers:
        first, last = (np.searchsorted(self._sorted, x, side=side) for side in ("left", "right"))
        return (last - first) / self._sorted.size

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        count = self._sorted.size
        place = count - np.floor(count * (probability + TIE)) if upper else np.ceil(count * (probability - TIE))
        value: Numbers = self._sorted[np.clip(place, 1, count).astype(np.intp) - 1]
        return value

    def moments(self) -> Moments:
        # a power of two, so that scaling is exact and no square leaves the doubles
        unit = np.ldexp(1.0, np.frexp(np.abs(self._sorted).max())[1])
        scaled = self._sorted / unit
        # offsets from a value near the mean are exact where it is far from 0, and so keep the digits of the spread
        rough = scaled.mean()
        beside = scaled - rough
        centre = rough + beside.mean()
        offsets = beside - beside.mean()
        spread = np.sqrt(np.mean(offsets * offsets))
        scores = offsets / np.where(self._distinct[0].size > 1, spread, NO_VALUE)
        return Moments(centre * unit, spread * unit, np.mean(scores**3), np.mean(scores**4) - 3)

    def most_likely(self) -> Numbers:
        values, counts = self._distinct
        stands_out = values.size == 1 or counts.max() > counts.min()
        return values[np.argmax(counts)] if stands_out else NO_VALUE

    def entropy(self) -> Numbers:
        entropy: Numbers = entr(self._distinct[1] / self._sorted.size).sum()
        return entropy

    def support(self) -> Support:
        return Support(self._sorted[0], self._sorted[-1])

    def values(self, low: Numbers, high: Numbers, most: int) -> Numbers:
        seen = self._distinct[0]
        inside = seen[(seen >= low) & (seen <= high)]
        return inside if inside.size <= most else inside[np.rint(np.linspace(0, inside.size - 1, most)).astype(np.intp)]
