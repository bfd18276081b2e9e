"""Values at given probabilities: quantiles of either tail and central intervals."""

from typing import NamedTuple

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.family import Family


class Quantile(NamedTuple):
    """A value, and the probability that the law gives to its tail: P(X <= value), or P(X > value) of the upper."""

    value: Numbers
    probability_at_value: Numbers


class Interval(NamedTuple):
    """Ends of an interval with equal probabilities outside on either side."""

    lower: Numbers
    upper: Numbers


def quantile(law: Family, probability: Numbers, upper: bool) -> Quantile:
    """Give the smallest x with P(X <= x) >= probability; of the upper tail, with P(X > x) <= probability.

    `probability` lies in [0, 1] and broadcasts with the parameters; 0 and 1 are answered by the ends of the support.
    """
    with np.errstate(all="ignore"):
        value = _value(law, probability, upper)
        finite = np.isfinite(value)
        if finite.all():
            tails = law.tails(value)
            return Quantile(value, tails.above if upper else tails.at_most)
        tails = law.tails(np.where(finite, value, 0))
        beyond = (value < 0) if upper else (value > 0)
        return Quantile(value, np.where(finite, tails.above if upper else tails.at_most, beyond)[()])


def central_interval(law: Family, coverage: Numbers) -> Interval:
    """Give the interval that leaves (1 - coverage)/2 on either side; the upper end comes from the upper tail."""
    with np.errstate(all="ignore"):
        outside = (1 - coverage) / 2
        return Interval(_value(law, outside, upper=False), _value(law, outside, upper=True))


def _value(law: Family, probability: Numbers, upper: bool) -> Numbers:
    inner = (probability > 0) & (probability < 1)
    if inner.all():
        return law.quantile(probability, upper)
    support = law.support()
    value = law.quantile(np.where(inner, probability, 0.5)[()], upper)
    at_lower_end = (probability >= 1) if upper else (probability <= 0)
    return np.where(inner, value, np.where(at_lower_end, support.lower, support.upper))[()]
