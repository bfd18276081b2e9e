"""Where a probability passes a wanted one: a search that keeps its bracket."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from scipy.special import ndtri

CLOSE = 1e-11
"""A probability this close to the wanted one is it."""
NARROW = 1e-14
"""A bracket this narrow in the logarithm is a point."""
SATURATED = 1e-12
"""Nearer to 0 or 1 a probability says nothing of how far it is."""
STEEP = 1e-3
"""Within so much on the normal scale the interpolation is trusted to the end."""
PATIENCE = 50
"""After so many trials a bracket that does not shrink is halved, however close."""
FARTHEST = 1e12

Probability = Callable[[float], float]


@dataclass(frozen=True, slots=True)
class Boundary:
    """The last value on the good side, and the probability there."""

    value: float
    probability: float


def least_reaching(probability: Probability, wanted: float, none: Boundary, scale: float) -> Boundary | None:
    """Find the least value that reaches the wanted probability, which rises; it is not reached at `none`.

    None if no value up to 1e12 scales does.
    """
    bad, value = none.value, scale
    while (reached := probability(value)) < wanted:
        if value > FARTHEST * scale:
            return None
        bad, value = value, 10 * value
    return boundary(probability, wanted, Boundary(value, reached), bad)


def greatest_reaching(probability: Probability, wanted: float, none: Boundary, scale: float) -> Boundary:
    """Find the greatest value that reaches the wanted probability, which falls to 0; it is reached at `none`."""
    good, value = none, scale
    while (reached := probability(value)) >= wanted:
        good, value = Boundary(value, reached), 10 * value
    return boundary(probability, wanted, good, value)


def boundary(probability: Probability, wanted: float, good: Boundary, bad: float) -> Boundary:
    """Find where `probability` passes `wanted` between a value that reaches it and one that does not; both >= 0.

    Works in u = log(value + offset) and g = Phi^-1(P) - Phi^-1(wanted), nearly straight: inverse quadratic and secant
    steps through the best points, bisection where they leave the bracket or it does not shrink. |P - wanted| <= 1e-11,
    or, where P jumps, the value that reaches it beside the jump.
    """
    search = _Search(wanted, good, bad)
    while not search.narrow:
        u = search.next()
        reached = probability(search.value(u))
        if abs(reached - wanted) <= CLOSE:
            return Boundary(search.value(u), reached)
        search.learn(u, reached)
    return search.good


@dataclass
class _Search:
    wanted: float
    good: Boundary
    bad: float
    offset: float = 0.0
    points: list[tuple[float, float]] = field(default_factory=list)
    widths: list[float] = field(default_factory=list)

    def __post_init__(self) -> None:
        least, most = sorted((self.good.value, self.bad))
        self.offset = 0.0 if least > 0 else most / 1000
        self.good_u, self.bad_u = self.place(self.good.value), self.place(self.bad)
        self._remember(self.good_u, self.good.probability)

    def place(self, value: float) -> float:
        return float(np.log(value + self.offset))

    def value(self, u: float) -> float:
        return max(float(np.exp(u)) - self.offset, 0.0)

    @property
    def narrow(self) -> bool:
        return abs(self.good_u - self.bad_u) < NARROW * max(1.0, abs(self.good_u))

    def learn(self, u: float, reached: float) -> None:
        """Narrow the bracket by a trial."""
        if reached >= self.wanted:
            self.good, self.good_u = Boundary(self.value(u), reached), u
        else:
            self.bad, self.bad_u = self.value(u), u
        self.widths.append(abs(self.good_u - self.bad_u))
        self._remember(u, reached)

    def _remember(self, u: float, reached: float) -> None:
        if SATURATED < reached < 1 - SATURATED:
            g = float(ndtri(reached) - ndtri(self.wanted))
            self.points = sorted([*self.points, (u, g)], key=lambda point: abs(point[1]))[:3]

    def next(self) -> float:
        """Give the next place to try, strictly within the bracket."""
        low, high = sorted((self.good_u, self.bad_u))
        stalled = len(self.widths) > 3 and self.widths[-1] > 0.5 * self.widths[-4]
        steep = bool(self.points) and abs(self.points[0][1]) < STEEP and len(self.widths) < PATIENCE
        if steep or not stalled:
            for count in (3, 2):
                u = interpolated(self.points[:count]) if len(self.points) >= count else np.nan
                if low < u < high:
                    return u
        return (low + high) / 2


def interpolated(points: list[tuple[float, float]]) -> float:
    """Give u at g = 0 of the polynomial u(g) through the points (u, g); nan where two have the same g."""
    found = 0.0
    for index, (u, g) in enumerate(points):
        for other, (_, other_g) in enumerate(points):
            if other != index:
                if g == other_g:
                    return np.nan
                u *= -other_g / (g - other_g)  # noqa: PLW2901 - a product of factors
        found += u
    return found
