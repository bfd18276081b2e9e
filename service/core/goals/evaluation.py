"""One computation of a plan with its error: what outlooks and requirements are made of."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.goals.course import COARSER, RATIO, Course
from service.core.goals.growth import discrete, divides, drifts, growth_of, step_laws
from service.core.goals.listed import Step, listed_course
from service.core.goals.plan import Plan
from service.core.goals.quadrature import Quadrature
from service.core.goals.recursion import Recursion
from service.core.goals.surprises import Surprises, blended, surprises_of
from service.core.goals.timeline import Timeline, timeline
from service.core.goals.wealth import Wealth
from service.core.goals.work import Work


@dataclass(frozen=True)
class Evaluation:
    """The course of a plan, and the error of every probability in it."""

    timeline: Timeline
    course: Course
    numerical_error: float


@dataclass(frozen=True)
class Runs:
    """Everything that runs of one plan share."""

    plan: Plan
    dates: Timeline
    work: Work

    def blend(self, reported: frozenset[int], averages: bool = True) -> tuple[Course, float]:
        """Follow the plan for every possible mean return, and mix; with the error of the mixing."""
        listed = self.listed(reported)
        if listed:
            return listed, 0.0
        surprises = surprises_of(self.plan)
        courses = [self.one(reported, RATIO, averages, surprise) for surprise in surprises.values]
        return blended(surprises, courses), self._error_of(surprises, courses)

    def one(self, reported: frozenset[int], ratio: float, averages: bool, surprise: float = 0.0) -> Course:
        """Follow the plan once."""
        quadrature = Quadrature(self.work)
        growth = growth_of(self.plan, self.dates, quadrature, surprise, RATIO / ratio)
        least = min((target for target in self.plan.targets if target > 0), default=None)
        recursion = Recursion(self.dates.flows, growth, reported, quadrature, least, averages, ratio)
        return recursion.run(self.plan.initial_value or 0.0)

    def listed(self, reported: frozenset[int]) -> Course | None:
        """Follow every path, where growth takes few values and there are few; else None."""
        if any(divides(leg) for leg in self.plan.legs):
            return None
        laws, kinds, periods = step_laws(self.plan, self.dates)
        atoms = [found for law in laws if (found := law.atoms())]
        if len(atoms) < len(laws):
            return None
        certain = np.exp(drifts(self.plan, self.dates))
        steps = [
            Step(np.exp(atoms[kind][0]), atoms[kind][1], int(n), float(factor))
            for kind, n, factor in zip(kinds, periods, certain, strict=True)
        ]
        return listed_course(self.dates.flows, steps, self.plan.initial_value or 0.0, reported, self.work)

    def chances(self, course: Course) -> Numbers:
        """Give the probabilities that an error is stated for: depleted by each date, success at each target."""
        last = course.wealth.get(self.dates.dates.size - 1)
        reached = [last.solvent_at_least(target) for target in self.plan.targets] if last else []
        return np.concatenate([np.cumsum(course.unpaid + course.lost), reached])

    def roughness(self, course: Course) -> float:
        """Give the probability that may be on the wrong side of a withdrawal or a target."""
        last = course.wealth[self.dates.dates.size - 1]
        return course.roughness + max(last.roughness(target) for target in self.plan.targets)

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
    runs = Runs(plan, dates, work)
    course, mixing = runs.blend(frozenset(int(year) for year in dates.years))
    error = course.error_floor
    if course.error_share > 0:
        last = frozenset([dates.dates.size - 1])
        fine = course if mixing == 0 else runs.one(last, RATIO, averages=False)
        coarse = runs.one(last, RATIO / COARSER, averages=False)
        difference = float(np.abs(runs.chances(coarse) - runs.chances(fine)).max())
        # runs of a discrete law may agree by chance: an outcome falls on one side of a threshold or the other
        rough = max(runs.roughness(course), runs.roughness(coarse)) if discrete(plan) else 0.0
        error = min(mixing + max(course.error_share * difference, course.defect, course.error_floor, rough), 1.0)
    return Evaluation(dates, course, error)


def final_wealth(plan: Plan, work: Work) -> Wealth:
    """Give the law of wealth at the horizon."""
    dates = timeline(plan)
    last = dates.dates.size - 1
    return Runs(plan, dates, work).blend(frozenset([last]), averages=False)[0].wealth[last]


def chance(plan: Plan, solvency: bool, work: Work) -> float:
    """Give the probability of success at the first target, or of paying every withdrawal."""
    return final_wealth(plan, work).solvent_at_least(0.0 if solvency else plan.targets[0])
