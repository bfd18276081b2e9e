"""The law of the log growth of one period, as the Fourier method needs it."""

from dataclasses import dataclass, field

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.compounding.growth import Growth


class Part:
    """A component of the law of X = log G where G > 0: a density that is integrated over nodes."""

    def nodes(self, highest: float) -> tuple[Numbers, Numbers]:
        """Give places x and weights: E[exp(iuX)] of the component, with its own weight, for |u| <= highest.

        The trapezoidal rule in a variable in which the integrand is analytic: error 1e-15.
        """
        raise NotImplementedError

    smooth: bool = False
    """Whether the density of X is given, and so smooth that even steps in X serve for it."""

    def density(self, x: Numbers) -> Numbers:
        """Give the density of X, with the component's own weight."""
        raise NotImplementedError

    def sharp_places(self) -> Numbers:
        """Give the places at which the density may have a narrow peak."""
        return np.zeros(0)


class ValuesPart(Part):
    """Finitely many values: the sum is exact, and the transform never comes to rest at 0."""

    def __init__(self, values: Numbers, masses: Numbers) -> None:
        self.values = values
        self.masses = masses

    def nodes(self, highest: float) -> tuple[Numbers, Numbers]:  # noqa: ARG002 - exact for every frequency
        return self.values, self.masses


@dataclass(frozen=True)
class Step:
    """One period: its components, single values beside them with their probabilities, and the growth's moments."""

    parts: tuple[Part, ...]
    growth: Growth
    values: Numbers = field(default_factory=lambda: np.zeros(0))
    masses: Numbers = field(default_factory=lambda: np.zeros(0))

    def nodes(self) -> tuple[Numbers, Numbers]:
        """Places and weights of the whole law, for its moments."""
        found = [part.nodes(0.0) for part in self.parts]
        places = np.concatenate([*(x for x, _ in found), self.values])
        weights = np.concatenate([*(w for _, w in found), self.masses])
        return places[weights > 0], weights[weights > 0]


def evenly(first: float, last: float, frequency: float) -> tuple[Numbers, float]:
    """Points on [first, last], and their distance, for a rule that is exact up to this frequency of the integrand."""
    count = int(np.ceil((last - first) * frequency / (2 * np.pi))) + 1
    # the distance of two neighbours would have lost digits to their size
    return np.linspace(first, last, count + 1), (last - first) / count
