"""From the returns of a plan to the growth between its dates."""

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit, Refusal
from service.core.goals.course import Growth
from service.core.goals.fitting import WHOLE
from service.core.goals.normal_growth import NormalGrowth
from service.core.goals.plan import Leg, Plan
from service.core.goals.timeline import Indices, Timeline
from service.core.returns import law_of_horizon


def growth_of(plan: Plan, timeline: Timeline, surprise: float = 0.0) -> Growth:
    """Give the growth from each date to the next, after fee and inflation, in today's money.

    `surprise`: by how many standard errors the true mean per period exceeds the estimate. Raises DoesNotFit.
    """
    lengths, legs = timeline.lengths, legs_of(plan, timeline)
    means, variances = np.array([_per_year(plan, index, leg, surprise) for index, leg in enumerate(plan.legs)]).T
    return NormalGrowth(means[legs] * lengths + drifts(plan, timeline), variances[legs] * lengths)


def legs_of(plan: Plan, timeline: Timeline) -> Indices:
    """Give the position of the leg that rules from each date to the next."""
    ends = np.array([np.inf if leg.until_year is None else leg.until_year for leg in plan.legs[:-1]])
    return np.asarray(np.searchsorted(ends, timeline.dates[:-1] + WHOLE), np.int64)


def drifts(plan: Plan, timeline: Timeline) -> Numbers:
    """Give the certain part of log growth from each date to the next: fee, inflation, and a shock in its step."""
    drift: Numbers = timeline.lengths * (np.log1p(-plan.yearly_fee) - np.log1p(plan.inflation_rate))
    if plan.shock is not None:
        drift[timeline.position(plan.shock.at_year)] += np.log1p(plan.shock.return_)
    return drift


def _per_year(plan: Plan, index: int, leg: Leg, surprise: float) -> tuple[float, float]:
    """Mean and variance of log growth per year, where the law divides."""
    returns = leg.returns
    if returns.compounding not in returns.model.divides:
        detail = "Goals are available for the models lognormal, and normal with continuous compounding."
        path = (*plan.leg_path(index), "model")
        raise DoesNotFit([Refusal(path, "model_not_available", detail, {"model": returns.model.name})])
    mean, deviation = (float(figure) for figure in law_of_horizon(returns, 1.0).log_growth())
    if plan.parameter_uncertainty == "predictive":
        periods = returns.periods_in_year
        mean += surprise * deviation * np.sqrt(periods / float(returns.sample_size or np.inf))
    return mean, deviation**2
