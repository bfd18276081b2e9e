"""Mean returns that are known from a sample only: every possible one, by its probability."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.goals.course import Course
from service.core.goals.plan import Plan
from service.core.goals.wealth import MixedWealth, Wealth

FARTHEST = 8.0
STEP = 0.8
"""The rule's step where the mean does not matter: exp(-2 pi^2/h^2) is 1e-13."""


@dataclass(frozen=True)
class Surprises:
    """By how many standard errors the true mean per period exceeds the estimate, and the weights of a rule over it."""

    values: Numbers
    weights: Numbers


def surprises_of(plan: Plan) -> Surprises:
    """Give places and weights for the standard normal law; the one place 0 where the mean is taken as known.

    The chance as a function of the surprise x is about Phi(a + b x), b^2 the periods of the plan over those behind the
    estimate; times the normal density it is integrated by even steps h with an error of exp(-2 pi^2/(h^2 (1 + b^2))).
    For E[V], which grows exponentially in x, the places go farther up. One draw rules the whole plan, all legs.
    """
    if plan.parameter_uncertainty != "predictive":
        return Surprises(np.zeros(1), np.ones(1))
    horizon = plan.horizon_years or 0.0
    share, growth = 0.0, 0.0
    for leg in plan.legs:
        sample = float(leg.returns.sample_size or np.inf)
        share = max(share, leg.returns.periods_in_year * horizon / sample)
        deviation = float(leg.returns.moments().standard_deviation)
        growth = max(growth, deviation * horizon * leg.returns.periods_in_year / float(np.sqrt(sample)))
    step = STEP / np.sqrt(1 + share)
    up, down = np.ceil((FARTHEST + min(growth, FARTHEST)) / step), np.ceil(FARTHEST / step)
    values = step * np.arange(-down, up + 1)
    weights = np.exp(-values * values / 2)
    return Surprises(values, weights / weights.sum())


def blended(surprises: Surprises, courses: Sequence[Course]) -> Course:
    """Mix the courses that belong to each surprise."""
    if len(courses) == 1:
        return courses[0]
    mixed = Course(
        unpaid=surprises.weights @ np.array([course.unpaid for course in courses]),
        lost=surprises.weights @ np.array([course.lost for course in courses]),
        expected=surprises.weights @ np.array([course.expected for course in courses]),
        defect=max(course.defect for course in courses),
        roughness=max(course.roughness for course in courses),
        method=courses[0].method,
        error_share=courses[0].error_share,
        error_floor=courses[0].error_floor,
    )
    mixed.wealth = {date: _mixed(surprises, [course.wealth[date] for course in courses]) for date in courses[0].wealth}
    return mixed


def _mixed(surprises: Surprises, laws: Sequence[Wealth]) -> Wealth:
    """Mix laws of one date; those listed are all the same, before growth is uncertain, or hold nothing."""
    random = [
        (weight, law) for weight, law in zip(surprises.weights, laws, strict=True) if isinstance(law, MixedWealth)
    ]
    return MixedWealth.blend(*zip(*random, strict=True)) if random else laws[0]
