"""A return that is one of equally likely observations."""

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, number
from service.core.distributions.family import Moments
from service.core.returns.law import COINCIDENCE, LogGrowth
from service.core.returns.laws.atoms import AtomsLaw


class SampleLaw(AtomsLaw):
    """R takes each of the given values, a flat array, with the same probability."""

    method = "counting"

    def __init__(self, values: Numbers) -> None:
        ordered = np.sort(values)
        mean, deviation, _, _ = sample_moments(ordered)
        growth = LogGrowth(NO_VALUE, NO_VALUE)
        if ordered[0] > -1:
            growth = LogGrowth(*sample_moments(np.log1p(ordered))[:2])
        cumulative = np.arange(1, ordered.size + 1) / ordered.size
        total_loss = number(np.searchsorted(ordered, -1 + 2 * COINCIDENCE, side="right") / ordered.size)
        super().__init__(ordered, cumulative, (mean, deviation), growth, total_loss)
        self.numerical_error = 1e-14


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
