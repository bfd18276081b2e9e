"""The Cornish-Fisher distribution."""

from collections.abc import Iterator, Mapping

import numpy as np
from scipy.special import log_ndtr, ndtr, ndtri

from service.core.arrays import INFINITY, MINUS_INFINITY, Numbers
from service.core.distributions.family import Cost, Family, Moments, Support, Tails
from service.core.distributions.kernels.cornish_fisher import (
    Expansion,
    entropy,
    inverse,
    log_density,
    most_likely_score,
    shape_moments,
)
from service.core.errors import Refusal
from service.core.parameters import Parameter, anywhere, positive

MOST_SKEWNESS = 6 * (np.sqrt(2) - 1)
ROUNDING = 1e-12


class Monotone:
    """The expansion rises everywhere: skewness and excess kurtosis lie in the region of Maillard (2012)."""

    words = "the expansion is monotone"

    def refusals(self, values: Mapping[str, Numbers]) -> Iterator[Refusal]:
        """Refuse a skewness for which no excess kurtosis will do, else the excess kurtosis with those that will."""
        skewness, excess = np.broadcast_arrays(values["skewness"], values["excess_kurtosis"])
        too_skew = np.abs(skewness) > MOST_SKEWNESS
        if too_skew.any():
            yield self._refusal("skewness", values, too_skew, (-MOST_SKEWNESS, MOST_SKEWNESS))
            return
        square = skewness * skewness
        root = np.sqrt(np.maximum(1 - square / 6 + square * square / 1296, 0))
        least, most = (4 * (1 + 11 * square / 36 + side * root) for side in (-1, 1))
        outside = (excess < least - ROUNDING) | (excess > most + ROUNDING)
        if outside.any():
            at = np.argmax(outside)
            yield self._refusal("excess_kurtosis", values, outside, (np.ravel(least)[at], np.ravel(most)[at]))

    @staticmethod
    def _refusal(name: str, values: Mapping[str, Numbers], broken: Numbers, limits: tuple[float, float]) -> Refusal:
        place = int(np.argmax(broken))
        at = (place,) if np.ndim(values[name]) else ()
        given = float(np.ravel(values[name])[place if at else 0])
        least, most = (float(limit) for limit in limits)
        beside = f" with a skewness of {float(np.ravel(np.broadcast_to(values['skewness'], broken.shape))[place]):.15g}"
        detail = (
            f"The expansion is not monotone: {name} must lie from {least:.6g} to {most:.6g}"
            f"{beside if name == 'excess_kurtosis' else ''}; it is {given:.15g}."
        )
        params = {"at_least": least, "at_most": most, "given": given}
        return Refusal((name, *at), "expansion_not_monotone", detail, params)


class CornishFisher(Family):
    """A normal law bent to a skewness and an excess kurtosis: returns known by four moments.

    X = mean + standard_deviation w(Z), w the third-order expansion of Cornish & Fisher (1937), refused where w is not
    monotone (Maillard 2012). Skewness and excess kurtosis are its parameters, not the moments that the law then has.
    Tails are those of Z at the one real root of the cubic. Against mpmath: 1e-13 relative down to 1e-300.
    """

    name = "cornish_fisher"
    support_words = "every number"
    numerical_error = 1e-13
    cost = Cost(9, 1, 36)
    mean = anywhere("the mean", example=0.05)
    standard_deviation = positive("the scale of the expansion", example=0.2)
    skewness = Parameter("the skewness put into the expansion", at_least=-3, at_most=3, example=-0.5)
    excess_kurtosis = Parameter("the excess kurtosis put into the expansion", at_least=-1, at_most=20, example=2)
    rules = (Monotone(),)

    @property
    def _expansion(self) -> Expansion:
        return Expansion.of(self.skewness, self.excess_kurtosis)

    def _score(self, x: Numbers) -> Numbers:
        return inverse((x - self.mean) / self.standard_deviation, self._expansion)

    def tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(ndtr(z), ndtr(-z))

    def log_tails(self, x: Numbers) -> Tails:
        z = self._score(x)
        return Tails(log_ndtr(z), log_ndtr(-z))

    def log_density(self, x: Numbers) -> Numbers:
        return log_density(self._score(x), self._expansion) - np.log(self.standard_deviation)

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        z = ndtri(probability)
        return self.mean + self.standard_deviation * self._expansion.value(-z if upper else z)

    def moments(self) -> Moments:
        spread, skewness, excess = shape_moments(self._expansion)
        return Moments(self.mean + 0 * spread, self.standard_deviation * spread, skewness, excess)

    def most_likely(self) -> Numbers:
        expansion = self._expansion
        return self.mean + self.standard_deviation * expansion.value(most_likely_score(expansion))

    def entropy(self) -> Numbers:
        return entropy(self._expansion) + np.log(self.standard_deviation)

    def support(self) -> Support:
        return Support(MINUS_INFINITY, INFINITY)
