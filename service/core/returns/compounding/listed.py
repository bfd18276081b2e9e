"""Growth with few enough outcomes to list them all."""

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.compounding.growth import Growth, growth_of_values
from service.core.returns.law import COINCIDENCE
from service.core.returns.laws.atoms import AtomsLaw

MOST_LISTED = 200_000


def listed_law(log_growth: Numbers, masses: Numbers, one: Growth, periods: Numbers, reach: float) -> AtomsLaw:
    """Give the law of outcomes with these log growths (-inf: a total loss) and probabilities, in any order.

    Outcomes that differ by rounding alone are one. `reach`: greatest log growth in size of the sums behind an outcome,
    whose last digits are lost.
    """
    closeness = COINCIDENCE * (1 + reach)
    order = np.argsort(log_growth, kind="stable")
    values = np.expm1(log_growth[order])
    apart = np.diff(values) > closeness * (1 + np.abs(values[:-1]))
    first = np.flatnonzero(np.concatenate([[True], apart]))
    cumulative = np.cumsum(np.add.reduceat(masses[order], first))
    law = AtomsLaw(
        values[first],
        cumulative / cumulative[-1],
        one.moments(periods),
        one.log_moments(periods),
        one.total_loss(periods),
        closeness,
    )
    law.cautions = one.cautions(periods)
    return law


def point(log_growth: Numbers, one: Growth, periods: Numbers) -> AtomsLaw:
    """Give the law of one outcome alone, by its log growth."""
    return listed_law(np.atleast_1d(log_growth), np.ones(1), one, periods, 0.0)


def certain(log_growth_of_period: Numbers, periods: Numbers) -> AtomsLaw:
    """Give the law of the same growth in every period; -inf and nan stand for a total loss."""
    log_growth = np.where(log_growth_of_period > -np.inf, log_growth_of_period, -np.inf)
    return point(periods * log_growth, growth_of_values(np.atleast_1d(log_growth), np.ones(1)), periods)
