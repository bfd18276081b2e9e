"""One computation of a plan with its error: what outlooks and requirements are made of."""

from dataclasses import dataclass

import numpy as np

from service.core.goals.course import Course, Growth
from service.core.goals.growth import growth_of
from service.core.goals.plan import Plan
from service.core.goals.quadrature import Quadrature
from service.core.goals.recursion import Recursion
from service.core.goals.timeline import Timeline, timeline
from service.core.goals.wealth import Wealth
from service.core.goals.work import Work

RATIO = 1.5
COARSER = 1.25
"""The second run has so much fewer points."""
FLOOR = 1e-11
"""Rounding of some hundred steps."""


@dataclass(frozen=True)
class Evaluation:
    """The course of a plan, and the error of every probability in it."""

    timeline: Timeline
    course: Course
    method: str
    numerical_error: float


def evaluate(plan: Plan, work: Work, reported: bool) -> Evaluation:
    """Compute a plan; `reported`: with the law of wealth at every year, not at the horizon alone."""
    dates = timeline(plan)
    last = dates.dates.size - 1
    shown = frozenset(int(year) for year in dates.years) if reported else frozenset([last])
    growth = growth_of(plan, dates)
    course = run(plan, dates, growth, shown, work, RATIO)
    coarse = run(plan, dates, growth, frozenset([last]), work, RATIO / COARSER, averages=False)
    difference = max(
        float(np.abs(np.cumsum(coarse.unpaid - course.unpaid)).max()),
        *(
            abs(coarse.wealth[last].solvent_at_least(target) - course.wealth[last].solvent_at_least(target))
            for target in plan.targets
        ),
    )
    # the rule's error falls as exp(-pi^2 r^2); ten times what that makes of the difference
    finer = min(1.0, 10 * float(np.exp(-np.square(np.pi * RATIO) * (1 - COARSER**-2))))
    return Evaluation(dates, course, "lognormal_mixture_quadrature", max(finer * difference, course.defect, FLOOR))


def run(
    plan: Plan,
    dates: Timeline,
    growth: Growth,
    reported: frozenset[int],
    work: Work,
    ratio: float = RATIO,
    averages: bool = True,
) -> Course:
    """Follow the plan once."""
    least = min((target for target in plan.targets if target > 0), default=None)
    recursion = Recursion(dates.flows, growth, reported, Quadrature(work), least, averages, ratio)
    return recursion.run(plan.initial_value or 0.0)


def final_wealth(plan: Plan, work: Work) -> Wealth:
    """Give the law of wealth at the horizon, by one run."""
    dates = timeline(plan)
    last = dates.dates.size - 1
    growth = growth_of(plan, dates)
    return run(plan, dates, growth, frozenset([last]), work, averages=False).wealth[last]


def chance(plan: Plan, solvency: bool, work: Work) -> float:
    """Give the probability of success at the first target, or of paying every withdrawal, by one run."""
    return final_wealth(plan, work).solvent_at_least(0.0 if solvency else plan.targets[0])
