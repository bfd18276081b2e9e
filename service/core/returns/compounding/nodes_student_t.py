"""Log growth by a return with Student's t."""

import numpy as np

from service.core.arrays import Numbers
from service.core.distributions.kernels.student_t import log_t_density
from service.core.returns.compounding.step import Part, evenly
from service.core.returns.laws.student_t import t_at

LEFT_END = -40.0
STRAIGHT_BELOW = 0.25
"""With the total loss so close to the centre, or above it, log growth itself is a good variable."""
NEGLIGIBLE = 1e-17
COARSE = 400


class StudentTPart(Part):
    """1 + Y = 1 + location + scale T with scale > 0; X = log(1 + Y) where that has a value.

    In units of the scale the loss lies at -a, a = (1 + location)/scale. The rule runs over t with
    X = log(1 + location) + asinh(k sinh(t)/(2 a)), k = min(sqrt(v), 4): logarithmic towards the loss, linear about the
    centre, logarithmic again on the right. For a < 1/4 over X itself.
    """

    smooth = True

    def __init__(self, degrees_of_freedom: Numbers, location: Numbers, scale: Numbers) -> None:
        self.v, self.location, self.scale = degrees_of_freedom, location, scale
        self._a = (1 + location) / scale

    def density(self, x: Numbers) -> Numbers:
        growth = np.exp(x) / self.scale
        return np.exp(log_t_density(self.v, growth - self._a)) * growth

    def nodes(self, highest: float) -> tuple[Numbers, Numbers]:
        farthest = -t_at(self.v, np.float64(NEGLIGIBLE))  # type: ignore[arg-type]  # numpy's scalar stands for an array
        if self._a < STRAIGHT_BELOW:
            return self._straight(highest, float(farthest))
        return self._bent(highest, float(farthest))

    def _straight(self, highest: float, farthest: float) -> tuple[Numbers, Numbers]:
        last = float(np.log(self.scale * (farthest + max(float(self._a), 0.0))))
        first = float(np.log(self.scale)) + LEFT_END
        x, distance = evenly(first, max(last, first + 45), highest + 46)
        return x, self.density(x) * distance

    def _bent(self, highest: float, farthest: float) -> tuple[Numbers, Numbers]:
        a, bend = float(self._a), min(float(np.sqrt(self.v)), 4.0)
        ends = np.arcsinh(2 * a / bend * np.sinh([LEFT_END, np.log1p(farthest / a)]))
        t = np.linspace(float(ends[0]), float(ends[1]), COARSE)
        _, density, rise = self._bent_at(t, bend)
        inside = np.flatnonzero(density > NEGLIGIBLE / 100)
        first, last = t[max(inside[0] - 1, 0)], t[min(inside[-1] + 1, COARSE - 1)]
        steepest = float(rise[density > NEGLIGIBLE].max())
        t, distance = evenly(float(first), float(last), highest * steepest + (29 if self.v <= 6 else 46))
        beside, density, _ = self._bent_at(t, bend)
        return np.log1p(self.location) + beside, density * distance

    def _bent_at(self, t: Numbers, bend: float) -> tuple[Numbers, Numbers, Numbers]:
        """X - log(1 + location), the density of t, and dX/dt."""
        q = bend * np.sinh(t) / (2 * self._a)
        beside = np.arcsinh(q)
        rise = bend * np.cosh(t) / (2 * self._a) / np.hypot(1.0, q)
        z = self._a * np.expm1(beside)
        return beside, np.exp(log_t_density(self.v, z)) * self._a * np.exp(beside) * rise, rise
