"""Every outcome of a plan listed, where growth takes few values."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from service.core.arrays import Numbers
from service.core.goals.course import Course
from service.core.goals.wealth import ListedWealth
from service.core.goals.work import Work

MOST_LISTED = 3_200_000
MOST_MERGED = 200_000
"""Beyond, looking for equal outcomes costs more than it saves."""
SAME = 1e-13
"""Outcomes this close, as a share, are one."""


class Step(NamedTuple):
    """Growth until the next date: factors of one period above 0 and their probabilities, periods, a certain factor.

    What the probabilities miss of 1 is a total loss.
    """

    factors: Numbers
    masses: Numbers
    periods: int
    certain: float


def listed_course(
    flows: Numbers, steps: Sequence[Step], initial_value: float, reported: frozenset[int], work: Work
) -> Course | None:
    """Follow every path; None where there are too many."""
    course, last = Course.over(flows.size), flows.size - 1
    values, masses = np.array([initial_value]), np.ones(1)
    for date in range(flows.size):
        course.expected[date] = values @ masses
        before = ListedWealth(values, masses)
        flow = float(flows[date])
        if flow != 0:
            after = before.paying(flow)
            course.unpaid[date] = masses.sum() - after.masses.sum()
            values, masses = after.values, after.masses
        if date == last:
            before = ListedWealth(values, masses)
            course.expected[date] = values @ masses
        if date in reported:
            course.wealth[date] = before
        if date < last:
            alive = masses.sum()
            step = steps[date]
            for _ in range(step.periods):
                if values.size * step.factors.size > MOST_LISTED:
                    return None
                work.add(values.size * step.factors.size)
                values = np.multiply.outer(values, step.factors).ravel()
                masses = np.multiply.outer(masses, step.masses).ravel()
                if values.size <= MOST_MERGED:
                    values, masses = _merged(values, masses)
            values = values * step.certain
            course.lost[date + 1] = max(alive - masses.sum(), 0.0)
    return course


def _merged(values: Numbers, masses: Numbers) -> tuple[Numbers, Numbers]:
    """Sort outcomes and add up those that are equal but for rounding."""
    order = np.argsort(values)
    values, masses = values[order], masses[order]
    first = np.concatenate([np.ones(min(values.size, 1), bool), np.diff(values) > SAME * values[1:]])
    starts = np.flatnonzero(first)
    return values[starts], np.add.reduceat(masses, starts) if starts.size else masses
