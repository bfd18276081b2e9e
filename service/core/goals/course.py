"""What becomes of a plan's wealth from date to date."""

from dataclasses import dataclass, field
from typing import ClassVar, Protocol

import numpy as np

from service.core.arrays import Numbers, Truths
from service.core.goals.points import Points, Spread
from service.core.goals.wealth import PAID, ListedWealth, Wealth

RATIO = 1.75
"""Points in one deviation."""
COARSER = 1.25
"""The run that shows the error has so much fewer points."""


class Growth(Protocol):
    """Growth from each date to the next, independent, and the law of wealth that follows from points of it.

    A run's error is that share of its difference to a coarser run, at least `error_floor`.
    """

    method: ClassVar[str]
    error_share: ClassVar[float]

    @property
    def error_floor(self) -> float:
        """The least error that is stated."""

    @property
    def discrete(self) -> bool:
        """Whether it takes single values, which lie on one side of a withdrawal or the other."""

    @property
    def random(self) -> Truths:
        """Whether growth from each date to the next is uncertain."""

    @property
    def certain(self) -> Numbers:
        """Log growth where it is certain (-inf: a total loss)."""

    @property
    def log_factors(self) -> Numbers:
        """Logarithm of E[G]; +inf where the mean is infinite."""

    @property
    def survival(self) -> Numbers:
        """P(G > 0)."""

    def spread(self, points: Points, shift: float, start: int, end: int) -> Spread:
        """Give the law of wealth at date `end`, before its flow, from points after the flow at `start`."""

    def drift(self, start: int, end: int) -> float:
        """Give the centre of the log growth between two dates."""

    def deviation(self, start: int, end: int) -> float:
        """Give how far, in log wealth, growth between two dates spreads: beyond 8 of it next to nothing lies."""

    def spacing(self, spread: Spread, start: int, end: int, ratio: float) -> float:
        """Distance of the points after the flow at `start`, fine enough until `end`."""

    def trimmed(self, points: Points) -> Points:
        """Leave out points that do not matter."""


@dataclass
class Course:
    """Probabilities and averages at each date.

    `unpaid`: P(first depleted by the flow of the date). `lost`: P(first depleted by a total loss up to the date).
    `expected`: E[V] before the flow of the date (at the horizon after it). `wealth`: the law of V at the dates asked
    for, likewise. `defect`: largest probability that the recursion lost or made. `roughness`: probability that may be
    on the wrong side of a withdrawal, see Wealth. What it was computed by, and how its error follows from a coarser
    run, as in Growth; as it stands, for outcomes that are all listed.
    """

    unpaid: Numbers
    lost: Numbers
    expected: Numbers
    wealth: dict[int, Wealth] = field(default_factory=dict)
    defect: float = 0.0
    roughness: float = 0.0
    method: str = "enumeration"
    error_share: float = 0.0
    error_floor: float = 1e-12

    @classmethod
    def over(cls, dates: int) -> "Course":
        """Begin with nothing."""
        return cls(np.zeros(dates), np.zeros(dates), np.zeros(dates))

    def depleted(self) -> Numbers:
        """P(depleted) before the flow of each date; at the horizon after it, and one entry more: the same again."""
        unpaid: Numbers = np.concatenate([[0.0], np.cumsum(self.unpaid)[:-1]])
        return np.cumsum(self.lost) + unpaid

    def depletion_probability(self) -> float:
        """P(depleted by the horizon)."""
        return min(float(self.lost.sum() + self.unpaid.sum()), 1.0)


def certain_start(
    course: Course, flows: Numbers, growth: Growth, initial_value: float, reported: frozenset[int]
) -> tuple[int, float]:
    """Follow wealth while nothing about it is uncertain: to the date after whose flow it is above 0 and growth random.

    Gives that date and the wealth then; the last date, and the wealth or 0, where there is none.
    """
    value, alive, last = float(initial_value), True, flows.size - 1
    date = 0
    while True:
        before, flow = value, float(flows[date])
        if alive and flow < 0 and value + flow < PAID * flow:
            alive, course.unpaid[date] = False, 1.0
        value = max(value + flow, 0.0) if alive else 0.0
        shown = value if date == last else before
        course.expected[date] = shown
        if date in reported:
            listed = bool(alive or course.unpaid[date] * (date < last))
            course.wealth[date] = ListedWealth(np.full(int(listed), shown), np.ones(int(listed)))
        if date == last or (alive and value > 0 and growth.random[date]):
            return date, value
        if alive and value > 0 and growth.survival[date] == 0:
            alive, course.lost[date + 1] = False, 1.0
            value = 0.0
        value *= float(np.exp(growth.certain[date]))
        date += 1
