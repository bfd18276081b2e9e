"""The truncated normal distribution."""

from collections.abc import Iterator, Mapping

import numpy as np
from scipy.special import log_ndtr, ndtri_exp

from service.core.arrays import Numbers, flat
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.cut_moments import cut_moments
from service.core.distributions.kernels.elementary import HALF_LOG_2PI
from service.core.distributions.kernels.logarithms import smaller_tail
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.distributions.kernels.normal_interval import Cut, log_cut_density, log_lower_share, log_scaled_mass
from service.core.errors import Refusal
from service.core.parameters import Order, anywhere, positive

REACH = 40.0
"""No double is as small as the chance of a value so many standard deviations beyond the most likely one."""


MOST_SCORE = 1e6


class InReach:
    """The nearer end lies within a million standard deviations of the mean.

    Beyond, the law falls from that end by more between two doubles than can be told apart.
    """

    words = "the nearer end lies within 1e6 standard deviations of the mean"

    def refusals(self, values: Mapping[str, Numbers]) -> Iterator[Refusal]:
        """Refuse the lower end that lies too far above the mean, or the upper one too far below."""
        for name, side in (("lower", 1), ("upper", -1)):
            score = np.asarray(side * (values[name] - values["mean"]) / values["standard_deviation"])
            if (score > MOST_SCORE).any():
                place = int(np.argmax(score > MOST_SCORE))
                at = (place,) if np.ndim(values[name]) else ()
                given = float(np.ravel(score)[place])
                detail = (
                    f"{name} lies {given:.6g} standard deviations from the mean, towards the other end; at most 1e6."
                )
                yield Refusal((name, *at), "not_representable", detail, {"at_most": MOST_SCORE, "given": given})
                return


def _distance(cut: Cut, tail: Numbers) -> Numbers:
    """Distance from the lower end within which the cut law has the mass `tail`: Newton on its log, in log distance."""
    log_mass = log_scaled_mass(cut.a, cut.d) - np.square(cut.peak) / 2
    # far from the lower end by the normal quantile, close to it by the density there
    reached = np.logaddexp(log_ndtr(cut.a), np.log(tail) + log_mass)
    along = np.where(cut.a < 0, ndtri_exp(np.minimum(reached, 0)) - cut.a, 0)
    at_end = (cut.a - cut.peak) * (cut.a + cut.peak) / 2
    close = np.exp(np.minimum(np.log(tail) + log_scaled_mass(cut.a, cut.d) + at_end + HALF_LOG_2PI, 700))
    start = np.where(along > 1e-3, along, close)
    start = np.clip(np.where(np.isfinite(start), start, cut.d / 2), 1e-320, cut.d)

    def log_density(v: Numbers, a: Numbers, d: Numbers) -> Numbers:
        within = Cut(a, d, a + d)
        offset = np.where(a > 0, np.exp(v), np.where(within.b < 0, np.exp(v) - d, a + np.exp(v)))
        return v + log_cut_density(offset, within)

    v = newton_on_log_tail(
        lambda v, a, d: log_lower_share(np.exp(v), Cut(a, d, a + d)),
        log_density,
        np.log(tail),
        np.log(start),
        cut.a,
        cut.d,
        rising=True,
        low=-800.0,
        high=np.log(cut.d) + 1e-12,
    )
    return np.minimum(np.exp(v), cut.d)


class TruncatedNormal(Family):
    """A normal law of which only the part between two ends is possible; mean and spread are those of the whole law.

    Masses between two points scaled to the peak (see `log_scaled_mass`), so that ends far out in a tail do no harm;
    the quantile by Newton's method in the distance from the nearer end. Against mpmath: 1e-14 relative.
    """

    name = "truncated_normal"
    support_words = "lower <= x <= upper"
    method = "quadrature"
    quantile_method = "newton_on_log_tail"
    numerical_error = 4e-13
    cost = Cost(21, 2, 45)
    mean = anywhere("the mean of the whole normal law", example=0.05)
    standard_deviation = positive("the standard deviation of the whole normal law", example=0.2)
    lower = anywhere("the lower end", example=-0.3)
    upper = anywhere("the upper end", example=0.5)
    rules = (Order("lower", "upper"), InReach())

    def _between(self, lower: Numbers, upper: Numbers) -> Cut:
        a, b = ((end - self.mean) / self.standard_deviation for end in (lower, upper))
        return Cut(a, (upper - lower) / self.standard_deviation, b)

    @property
    def _cut(self) -> Cut:
        return self._between(self.lower, self.upper)

    def _reached(self, x: Numbers) -> tuple[Numbers, Numbers]:
        """The ends, or points beyond which no double finds mass: distances from an end have to tell values apart."""
        near = self.most_likely()
        # at an end far out the law falls like exp(-|score| t): 20 REACH such lengths hold all that a double can find
        score = np.abs(near - self.mean) / self.standard_deviation
        far = REACH * self.standard_deviation * np.minimum(1, 20 / score)
        return (
            np.maximum(self.lower, np.minimum(near, x) - far),
            np.minimum(self.upper, np.maximum(near, x) + far),
        )

    def log_tails(self, x: Numbers) -> Tails:
        inside = np.clip(x, self.lower, self.upper)
        lower, upper = self._reached(inside)
        below, above = ((side / self.standard_deviation) for side in (inside - lower, upper - inside))
        cut = self._between(lower, upper)
        return Tails(log_lower_share(below, cut), log_lower_share(above, Cut(-cut.b, cut.d, -cut.a)))

    def log_density(self, x: Numbers) -> Numbers:
        cut = self._cut
        origin = np.where(cut.a > 0, self.lower, np.where(cut.b < 0, self.upper, self.mean))
        value = log_cut_density((x - origin) / self.standard_deviation, cut) - np.log(self.standard_deviation)
        return np.where((x >= self.lower) & (x <= self.upper), value, -np.inf)[()]

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        tail, lower = smaller_tail(probability, upper)
        first, last = self._reached(self.most_likely())
        shape, (p, is_lower, a, d, b) = flat(tail, lower, *self._between(first, last))
        from_below = is_lower > 0
        start = np.where(from_below, a, -b)
        distance = _distance(Cut(start, d, start + d), p).reshape(shape)[()] * self.standard_deviation
        value = np.where(from_below.reshape(shape), first + distance, last - distance)
        return np.clip(value, self.lower, self.upper)

    def moments(self) -> Moments:
        mean, spread, skewness, excess = cut_moments(self._cut)
        return Moments(
            self.most_likely() + self.standard_deviation * mean, self.standard_deviation * spread, skewness, excess
        )

    def most_likely(self) -> Numbers:
        return np.clip(self.mean, self.lower, self.upper)

    def entropy(self) -> Numbers:
        cut = self._cut
        mean, spread, _, _ = cut_moments(cut)
        square = spread * spread + mean * mean + 2 * cut.peak * mean
        return np.log(self.standard_deviation) + log_scaled_mass(cut.a, cut.d) + HALF_LOG_2PI + square / 2

    def support(self) -> Support:
        return Support(self.lower, self.upper)
