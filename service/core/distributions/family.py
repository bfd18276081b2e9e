"""What a distribution family declares, and what follows from the declaration."""

from typing import ClassVar, NamedTuple

import numpy as np

from service.core.arrays import Numbers
from service.core.declared import Declared

FAMILIES: dict[str, type["Family"]] = {}
"""Every family by its name, in the order of the files."""


class Tails(NamedTuple):
    """P(X <= x) and P(X > x), or their logarithms: each from a formula of its own, never one minus the other."""

    at_most: Numbers
    above: Numbers


class Moments(NamedTuple):
    """The first four moments. Infinite ones are inf, those that have no value are nan."""

    mean: Numbers
    standard_deviation: Numbers
    skewness: Numbers
    excess_kurtosis: Numbers


class Support(NamedTuple):
    """The least and the greatest possible value; -inf and inf where there is none."""

    lower: Numbers
    upper: Numbers


class Cost(NamedTuple):
    """Microseconds for one entry of an array, measured on one core and rounded up."""

    event: float = 3.0
    quantile: float = 3.0
    description: float = 6.0


class Family(Declared):
    """Base of every family.

    A family gives `tails` or `log_tails` or both (the other follows by log or exp, so `tails` alone is for laws whose
    tails do not underflow), `density` or `log_density` or both, `quantile`, `moments`, `most_likely`, `entropy` and
    `support`. All take and give float64 values that broadcast with the parameters; arguments are never nan. The
    callers silence numpy's floating-point warnings and answer probabilities 0 and 1 from the support.

    Its docstring opens with one sentence on what the family is used for (catalogue and reference print it), then names
    method, source and error.
    """

    discrete: ClassVar[bool] = False
    support_words: ClassVar[str] = ""
    """The support as the reference prints it, in terms of the parameters."""
    method: ClassVar[str] = "closed_form"
    quantile_method: ClassVar[str] = "closed_form"
    numerical_error: ClassVar[float] = 0.0
    """Bound on the error of every figure: absolute for figures up to 1 in size, relative beyond."""
    cost: ClassVar[Cost] = Cost()
    """What an entry of an array costs, each a law of its own; the work of a question is counted from it."""
    _logs_first: ClassVar[bool] = False

    def __init_subclass__(cls) -> None:
        cls.declare()
        if cls.name in FAMILIES:
            raise TypeError(f"the family {cls.name} is declared twice")
        own = set(vars(cls))
        missing = {"quantile", "moments", "most_likely", "entropy", "support"} - own
        either = all(own & forms for forms in ({"tails", "log_tails"}, {"density", "log_density"}))
        if missing or not either or not cls.support_words or not cls.numerical_error:
            raise TypeError(
                f"{cls.name}: tails, a density, support_words, numerical_error and {sorted(missing)} are needed"
            )
        cls._logs_first = "tails" not in own
        FAMILIES[cls.name] = cls

    def tails(self, x: Numbers) -> Tails:
        """P(X <= x) and P(X > x)."""
        logs = self.log_tails(x)
        return Tails(np.exp(logs.at_most), np.exp(logs.above))

    def log_tails(self, x: Numbers) -> Tails:
        """Give the natural logarithms of P(X <= x) and P(X > x), right where the probability itself underflows."""
        at_most, above = self.tails(x)
        return Tails(_log_by_other(at_most, above), _log_by_other(above, at_most))

    def tails_and_logs(self, x: Numbers) -> tuple[Tails, Tails]:
        """Both, without computing either twice."""
        if not self._logs_first:
            return self.tails(x), self.log_tails(x)
        logs = self.log_tails(x)
        return Tails(np.exp(logs.at_most), np.exp(logs.above)), logs

    def density(self, x: Numbers) -> Numbers:
        """Probability density at x; the probability of exactly x for a discrete family."""
        return np.exp(self.log_density(x))

    def log_density(self, x: Numbers) -> Numbers:
        """Give the natural logarithm of `density`, right where the density itself underflows."""
        return np.log(self.density(x))

    def quantile(self, probability: Numbers, upper: bool) -> Numbers:
        """Invert the tail: probability strictly between 0 and 1.

        Lower tail: the smallest x with P(X <= x) >= probability. Upper: the smallest x with P(X > x) <= probability.
        """
        raise NotImplementedError

    def moments(self) -> Moments:
        """Mean, standard deviation, skewness, excess kurtosis."""
        raise NotImplementedError

    def most_likely(self) -> Numbers:
        """Where the density is greatest, the smallest such value; nan where no value stands out."""
        raise NotImplementedError

    def entropy(self) -> Numbers:
        """-E[log density], in nats."""
        raise NotImplementedError

    def support(self) -> Support:
        """Least and greatest possible value."""
        raise NotImplementedError

    def values(self, low: Numbers, high: Numbers, most: int) -> Numbers:
        """Give the possible values of a discrete law in [low, high]; of more than `most`, so many evenly spread."""
        first, last = np.ceil(low), np.floor(high)
        if last - first < most:
            return np.arange(float(first), float(last) + 1)
        return np.unique(np.rint(np.linspace(first, last, most)))


def _log_by_other(probability: Numbers, other: Numbers) -> Numbers:
    """Logarithm of a tail; of one above 1/2 through the other one, which keeps the digits of a value near 0."""
    return np.where(probability > 0.5, np.log1p(-other), np.log(probability))[()]
