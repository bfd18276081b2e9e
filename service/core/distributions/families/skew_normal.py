"""The skew normal distribution."""

import numpy as np
from scipy.special import ndtri_exp

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers, flat
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.logarithms import LOG_HALF, smaller_tail
from service.core.distributions.kernels.newton import newton_on_log_tail
from service.core.distributions.kernels.skew_normal import log_skew_density, log_skew_tails, skew_entropy, skew_mode
from service.core.parameters import Parameter, anywhere, positive


def _quantile(a: Numbers, tail: Numbers, lower: bool) -> Numbers:
    """Quantile for shape a >= 0; the start lies outside the tail, from where Newton's steps on it are monotone."""
    target = np.log(tail)
    start = np.minimum(ndtri_exp(target) / np.sqrt(1 + a * a), 0.5) if lower else -ndtri_exp(target + LOG_HALF)
    side = 0 if lower else 1
    return newton_on_log_tail(lambda z, a: log_skew_tails(z, a)[side], log_skew_density, target, start, a, rising=lower)


class SkewNormal(Family):
    """A normal law leaning to one side: returns with a longer tail below (shape below 0) or above.

    The density is 2 phi(z) Phi(shape z), z = (x - location)/scale (Azzalini 1985); tails by Owen's integral (see
    `log_skew_tails`). Against mpmath: 1e-14 relative in the body, 2e-13 at 1e-300.
    """

    name = "skew_normal"
    support_words = "every number"
    method = "quadrature"
    quantile_method = "newton_on_log_tail"
    numerical_error = 2e-13
    cost = Cost(4, 10, 22)
    location = anywhere("the place of the law", example=0.1)
    scale = positive("the width", example=0.2)
    shape = Parameter("the lean: below 0 to the left", at_least=-1e6, at_most=1e6, example=-2)

    def _score(self, x: Numbers) -> Numbers:
        """The score of the law, or of its mirror image where the shape is below 0."""
        return np.where(self.shape < 0, -1, 1) * ((x - self.location) / self.scale)

    def log_tails(self, x: Numbers) -> Tails:
        at_most, above = log_skew_tails(self._score(x), np.abs(self.shape))
        mirrored = self.shape < 0
        return Tails(np.where(mirrored, above, at_most)[()], np.where(mirrored, at_most, above)[()])

    def log_density(self, x: Numbers) -> Numbers:
        return log_skew_density(self._score(x), np.abs(self.shape)) - np.log(self.scale)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        tail, lower = smaller_tail(probability, upper)
        shape, (p, is_lower, lean) = flat(tail, lower, self.shape)
        below = (is_lower > 0) ^ (lean < 0)
        z = np.empty_like(p)
        for side in (True, False):
            i = np.flatnonzero(below == side)
            z[i] = _quantile(np.abs(lean[i]), p[i], lower=side)
        return self.location + self.scale * (np.where(lean < 0, -z, z).reshape(shape)[()])

    def moments(self) -> Moments:
        u = self.shape / np.hypot(1, self.shape) * np.sqrt(2 / np.pi)
        variance = 1 - u * u
        skewness = (4 - np.pi) / 2 * u**3 / variance**1.5
        excess = 2 * (np.pi - 3) * u**4 / variance**2
        return Moments(self.location + self.scale * u, self.scale * np.sqrt(variance), skewness, excess)

    def most_likely(self) -> Numbers:
        return self.location + self.scale * np.sign(self.shape) * skew_mode(np.abs(self.shape))

    def entropy(self) -> Numbers:
        return skew_entropy(np.abs(self.shape)) + np.log(self.scale)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
