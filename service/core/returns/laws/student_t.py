"""A return that is a scaled Student t."""

import numpy as np

from service.core.arrays import INFINITY, Numbers, Truths, number
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.distributions.kernels.student_t import log_t_density, log_t_tail, t_quantile
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, Ordering, log_growth_of_point, score
from service.core.returns.t_gaps import closed_t_gaps, lower_t_gaps


class StudentTLaw(HorizonLaw):
    """R = location + scale T, T standard Student t of more than 2 degrees of freedom, scale >= 0.

    `deviation`: sd[R] where it is known better than the scale gives it.
    """

    method = "closed_form_and_quadrature"
    numerical_error = 1e-13

    def __init__(
        self, degrees_of_freedom: Numbers, location: Numbers, scale: Numbers, deviation: Numbers | None = None
    ) -> None:
        # never broadcast: with one number of degrees of freedom there is one quantile to find
        self.degrees_of_freedom = degrees_of_freedom
        self.location = location
        self.scale = scale
        self._deviation = deviation_of_t(degrees_of_freedom, scale) if deviation is None else deviation

    def _score(self, threshold: Numbers) -> Numbers:
        return score(threshold - self.location, self.scale, COINCIDENCE * (1 + np.abs(threshold)))

    def mean(self) -> Numbers:
        return self.location

    def standard_deviation(self) -> Numbers:
        return self._deviation

    def probability_below(self, threshold: Numbers) -> Numbers:
        return t_at_most(self.degrees_of_freedom, self._score(threshold))

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        closeness = COINCIDENCE * (1 + np.abs(threshold))
        return t_at_most(self.degrees_of_freedom, -score(self.location - threshold, self.scale, closeness))

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(self.scale + 0 * (threshold + self.location + self.degrees_of_freedom) == 0)

    def gaps(self, threshold: Numbers) -> Gaps:
        v, scale, z = self.degrees_of_freedom, self.scale, self._score(threshold)
        upper = closed_t_gaps(v, threshold - self.location, scale, z, t_at_most(v, z))
        lower = lower_t_gaps(v, np.minimum(z, 0.0))
        above = z > 0
        return Gaps(np.where(above, upper[0], scale * lower[0]), np.where(above, upper[1], scale * scale * lower[1]))

    def quantile(self, probability: Numbers) -> Numbers:
        return self.location + self.scale * t_at(self.degrees_of_freedom, probability)

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        v, t = self.degrees_of_freedom, t_at(self.degrees_of_freedom, probability)
        # the density may underflow where its quotient by the probability does not
        log_mean = log_t_density(v, t) + np.log(v + t * t) - np.log(probability)
        mean_of_tail = self.location - self.scale * np.exp(log_mean) / (v - 1)
        return -mean_of_tail

    def log_growth(self) -> LogGrowth:
        return log_growth_of_point(self.location, self.scale)

    def total_loss_probability(self) -> Numbers:
        return self.probability_at_most(number(-1))

    def ordering(self) -> Ordering:
        location, scale, shape = np.broadcast_arrays(self.location, self.scale, self.degrees_of_freedom)
        return Ordering("student_t", shape, location, scale, location)


def deviation_of_t(degrees_of_freedom: Numbers, scale: Numbers) -> Numbers:
    """Give the standard deviation of a scaled Student t."""
    return scale * np.sqrt(degrees_of_freedom / (degrees_of_freedom - 2))


def scale_of_t(degrees_of_freedom: Numbers, deviation: Numbers) -> Numbers:
    """Give the scale of a Student t with this standard deviation."""
    return deviation * np.sqrt((degrees_of_freedom - 2) / degrees_of_freedom)


def t_at_most(degrees_of_freedom: Numbers, z: Numbers) -> Numbers:
    """P(T <= z), 0 and 1 at z = -+inf."""
    tail = log_t_tail(degrees_of_freedom, np.where(np.isfinite(z), np.abs(z), 0.0))
    inner = np.where(z < 0, np.exp(tail), -np.expm1(tail))
    return np.where(np.isfinite(z), inner, np.where(z == INFINITY, 1.0, 0.0))


def t_at(degrees_of_freedom: Numbers, probability: Numbers) -> Numbers:
    """Give the quantile of a standard Student t, found once for each of equal degrees of freedom.

    `probability`: one number, or an array whose last axis has length 1.
    """
    tail, lower = smaller_tail(probability, upper=False)
    if np.ndim(degrees_of_freedom):
        distinct, places = np.unique(degrees_of_freedom, return_inverse=True)
        t = t_quantile(distinct, tail)[..., places]
    else:
        t = t_quantile(degrees_of_freedom, tail)
    return np.where(lower, -t, t)
