"""One computation of a plan with its error: what outlooks and requirements are made of."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.goals.course import Course
from service.core.goals.growth import growth_of
from service.core.goals.plan import Plan
from service.core.goals.quadrature import Quadrature
from service.core.goals.recursion import Recursion
from service.core.goals.surprises import Surprises, blended, surprises_of
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


@dataclass(frozen=True)
class Runs:
    """Everything that runs of one plan share."""

    plan: Plan
    dates: Timeline
    work: Work

    def blend(self, reported: frozenset[int], averages: bool = True) -> tuple[Course, float]:
        """Follow the plan for every possible mean return, and mix; with the error of the mixing."""
        surprises = surprises_of(self.plan)
        courses = [self.one(reported, RATIO, averages, surprise) for surprise in surprises.values]
        return blended(surprises, courses), self._error_of(surprises, courses)

    def one(self, reported: frozenset[int], ratio: float, averages: bool, surprise: float = 0.0) -> Course:
        """Follow the plan once."""
        growth = growth_of(self.plan, self.dates, surprise)
        least = min((target for target in self.plan.targets if target > 0), default=None)
        recursion = Recursion(self.dates.flows, growth, reported, Quadrature(self.work), least, averages, ratio)
        return recursion.run(self.plan.initial_value or 0.0)

    def chances(self, course: Course) -> Numbers:
        """Give the probabilities that an error is stated for: depleted by each date, success at each target."""
        last = course.wealth.get(self.dates.dates.size - 1)
        reached = [last.solvent_at_least(target) for target in self.plan.targets] if last else []
        return np.concatenate([np.cumsum(course.unpaid + course.lost), reached])

    def _error_of(self, surprises: Surprises, courses: list[Course]) -> float:
        """Estimate the error of the rule over the mean return by that of the rule with half of its places."""
        if len(courses) == 1:
            return 0.0
        chances = np.array([self.chances(course) for course in courses])
        half = 2 * surprises.weights[::2] @ chances[::2]
        # halving the steps raises the error of a Gaussian rule to its fourth power
        return float(np.abs(half - surprises.weights @ chances).max()) ** 3


def evaluate(plan: Plan, work: Work) -> Evaluation:
    """Compute a plan, with the law of wealth at every year."""
    dates = timeline(plan)
    last = frozenset([dates.dates.size - 1])
    runs = Runs(plan, dates, work)
    course, mixing = runs.blend(frozenset(int(year) for year in dates.years))
    fine = course if mixing == 0 else runs.one(last, RATIO, averages=False)
    coarse = runs.one(last, RATIO / COARSER, averages=False)
    difference = float(np.abs(runs.chances(coarse) - runs.chances(fine)).max())
    # the rule's error falls as exp(-pi^2 r^2); ten times what that makes of the difference
    finer = min(1.0, 10 * float(np.exp(-np.square(np.pi * RATIO) * (1 - COARSER**-2))))
    error = mixing + max(finer * difference, course.defect, FLOOR)
    return Evaluation(dates, course, "lognormal_mixture_quadrature", error)


def final_wealth(plan: Plan, work: Work) -> Wealth:
    """Give the law of wealth at the horizon."""
    dates = timeline(plan)
    last = dates.dates.size - 1
    return Runs(plan, dates, work).blend(frozenset([last]), averages=False)[0].wealth[last]


def chance(plan: Plan, solvency: bool, work: Work) -> float:
    """Give the probability of success at the first target, or of paying every withdrawal."""
    return final_wealth(plan, work).solvent_at_least(0.0 if solvency else plan.targets[0])
