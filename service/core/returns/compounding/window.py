"""Where the growth over n periods lies, from the nodes of one period."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.compounding.step import Step

TAIL = 2e-12
"""Probability left outside the window at each end."""
SHARE_OF_JUMPS = 0.1
"""As much of it is left to single periods further out than any bound is good for."""
EXPONENTS = np.array([0.6, 1.2, 2, 3, 4.5, 6, 7.5, 9, 12])
"""In units of one over the deviation of the growth."""
PLAIN = np.array([0.5, 1, 1.5, 2, 2.5, 3, 4, 6, 9])


@dataclass(frozen=True, slots=True)
class Window:
    """Log growth is measured from n times `centre`, the mean of X; it lies in [low, high] but for 2e-12 at each end."""

    centre: float
    deviation: float
    """Of one period's X."""
    low: float
    high: float
    exponent: float
    """The t of the best bound at the upper end: E[exp(L)] is made inside the window if it is above 1, and so on."""

    @property
    def width(self) -> float:
        """Length of the window."""
        return self.high - self.low


def window_of(step: Step, periods: int) -> Window:
    """Find the window by Chernoff's bound (1952): P(L > x) <= E[exp(tL)] exp(-tx), the best of some t.

    The log growth of one period is cut where it has a probability below 2e-13 in all periods together: the rare
    jumps beyond, whose exponential moments would spoil the bound, are that improbable.
    """
    x, weights = step.nodes()
    order = np.argsort(x)
    x, weights = x[order], weights[order]
    alive = weights.sum()
    centre = float(weights @ x / alive)
    x = x - centre
    deviation = float(np.sqrt(weights @ (x * x) / alive))
    (high, exponent), (low, _) = (
        _reach(side * x[::side], weights[::side], periods, deviation * np.sqrt(periods)) for side in (1, -1)
    )
    return Window(centre, deviation, -low, high, exponent)


def _reach(x: Numbers, weights: Numbers, periods: int, scale: float) -> tuple[float, float]:
    """Give the upper end and the exponent of its bound, from places in rising order."""
    beyond = np.cumsum(weights[::-1])[::-1] * periods
    x = np.minimum(x, x[np.flatnonzero(beyond > SHARE_OF_JUMPS * TAIL)[-1]])
    exponents = np.concatenate([EXPONENTS / scale, PLAIN])
    products = np.multiply.outer(exponents, x)
    greatest = products.max(axis=1)
    logs = greatest + np.log(np.exp(products - greatest[:, np.newaxis]) @ weights)
    bounds = (periods * logs - np.log(TAIL)) / exponents
    best = int(np.argmin(bounds))
    return float(bounds[best]), float(exponents[best])
