"""A law in its figures: moments, middle, peak, entropy, support, and how much lies near the mean."""

from typing import NamedTuple

import numpy as np

from service.core.arrays import Numbers, number
from service.core.distributions.events import within
from service.core.distributions.family import Family
from service.core.distributions.quantiles import quantile


class Description(NamedTuple):
    """Figures of a law, all of one shape; infinite ones are inf, those that have no value nan.

    `entropy` is in nats; `mode` the smallest most likely value, nan where none stands out; `within_one` the
    probability of a value within one standard deviation of the mean, ends included.
    """

    mean: Numbers
    variance: Numbers
    standard_deviation: Numbers
    skewness: Numbers
    kurtosis: Numbers
    excess_kurtosis: Numbers
    median: Numbers
    mode: Numbers
    entropy: Numbers
    support_lower: Numbers
    support_upper: Numbers
    within_one: Numbers
    within_two: Numbers
    within_three: Numbers


def describe(law: Family) -> Description:
    """Describe a law; its parameters may be arrays."""
    with np.errstate(all="ignore"):
        moments = law.moments()
        mean, spread, skewness, excess = moments
        figures = (
            mean,
            spread * spread,
            spread,
            skewness,
            excess + 3,
            excess,
            quantile(law, number(0.5), upper=False).value,
            law.most_likely(),
            law.entropy(),
            *law.support(),
            *(within(law, number(count), moments).probability for count in (1, 2, 3)),
        )
        return Description(*(figure[()] for figure in np.broadcast_arrays(*figures)))
