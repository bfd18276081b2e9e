"""Tails of a sum of n Student t variables far from its centre, where one of them does it all."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.kernels.student_t import log_t_density
from service.core.returns.laws.student_t import t_at, t_at_most

SHIFT = np.array([0.0, 1.0, 1.5])[:, np.newaxis]
SPREAD = np.array([0.0, 1.0, 1.25])[:, np.newaxis]
"""Mean and variance of the greatest of j standard exponentials, for the gaps of orders 0, 1, 2."""
ALIASES = 12
DEGREE = 32


class PowerTails:
    """P(S + xi_j > y) for S the sum of n scaled Student t, xi_j the greatest of j standard exponentials.

    n (T(y - E[xi_j]) - (variance of the others and of xi_j) f'/2): one large term and, to second order, the spread of
    the others (Feller 1971 for the principle). Error of third order in deviation/y.
    """

    def __init__(self, degrees_of_freedom: Numbers, scale: Numbers, periods: int, period: float) -> None:
        self._v, self._scale, self._periods, self._period = degrees_of_freedom, scale, periods, period
        self._others = (periods - 1) * scale * scale * degrees_of_freedom / (degrees_of_freedom - 2)
        nodes = np.cos(np.pi * (np.arange(DEGREE + 1.0) + 0.5) / (DEGREE + 1))
        values = self._sum_of_aliases(nodes * period / 2)
        self._polynomials = np.asarray(np.polynomial.chebyshev.chebfit(nodes, values.T, DEGREE), np.float64)

    def _tail(self, y: Numbers, shift: Numbers) -> Numbers:
        """Tails of the three orders, along the second axis from the end, with `shift` taken from y."""
        v = self._v
        z = np.maximum(y - shift, y / 2) / self._scale
        slope = -(v + 1) * z / (v + z * z) * np.exp(log_t_density(v, z))
        spread = (self._others + SPREAD) / (self._scale * self._scale)
        tail: Numbers = self._periods * (t_at_most(v, -z) - spread * slope / 2)
        return tail

    def beyond(self, y: Numbers, side: int) -> Numbers:
        """Tails at y > 0 for the three orders: of the upper side (1), or P(S + xi_j < -y) on the lower (-1)."""
        return self._tail(y, side * SHIFT)

    def _sum_of_aliases(self, k: Numbers) -> Numbers:
        """The alternating sum over whole periods of the tails below and above, the last term halved."""
        m = np.arange(1.0, ALIASES + 1)[:, np.newaxis, np.newaxis]
        signs = (-1) ** m * np.where(m == ALIASES, 0.5, 1.0)
        differences = self._tail(m * self._period - k, -SHIFT) - self._tail(m * self._period + k, SHIFT)
        total: Numbers = (signs * differences).sum(axis=0)
        return total

    def aliases(self, k: Numbers) -> Numbers:
        """The same for k within half a period of the centre, from its Chebyshev polynomial: error 1e-16."""
        return np.asarray(np.polynomial.chebyshev.chebval(k / (self._period / 2), self._polynomials), np.float64)

    def farthest(self, probability: Numbers) -> float:
        """Give a distance from the centre that is exceeded with less than half of this probability."""
        return 2 * float(-self._scale * t_at(self._v, probability / (4 * self._periods))) + 40
