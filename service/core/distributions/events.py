"""Events: sets of values written by their bounds, and how likely a law makes them."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple, Self

import numpy as np

from service.core.arrays import MINUS_INFINITY, NO_VALUE, Numbers, number
from service.core.distributions.family import Family, Moments
from service.core.distributions.intervals import between
from service.core.errors import DoesNotFit, Refusal

LOWER_BOUNDS = {"above": False, "at_least": True}
"""Bounds from below, and whether the bound itself belongs to the event."""
UPPER_BOUNDS = {"below": False, "at_most": True}
ALONE = ("exactly", "within_standard_deviations")
SLACK = 4 * np.finfo(np.float64).eps


@dataclass(frozen=True, slots=True)
class Event:
    """The values between two bounds, either of which may be missing; or those near the mean.

    `within` counts standard deviations to either side of the mean, ends included, and then stands alone.
    """

    lower: Numbers | None = None
    lower_included: bool = False
    upper: Numbers | None = None
    upper_included: bool = False
    within: Numbers | None = None

    @classmethod
    def of(cls, bounds: Mapping[str, float | Numbers]) -> Self:
        """Make an event from finite bounds by their names: above, at_least, below, at_most; exactly; or
        within_standard_deviations. Raises DoesNotFit.
        """  # noqa: D205 - the list of names is one sentence
        values = {name: number(v) if isinstance(v, float) else v for name, v in bounds.items()}
        lower, upper = (next((n for n in names if n in values), None) for names in (LOWER_BOUNDS, UPPER_BOUNDS))
        if not values:
            raise DoesNotFit([Refusal((), "no_event", "An event needs a bound.")])
        alone = next(iter(values)) if len(values) == 1 else None
        if alone == "exactly":
            return cls(values[alone], True, values[alone], True)
        if alone == "within_standard_deviations":
            _refuse_negative(values[alone], alone)
            return cls(within=values[alone])
        if len(values) != (lower is not None) + (upper is not None):
            names = ", ".join(values)
            detail = f"{names} do not go together: give one bound from below, one from above, or either alone."
            raise DoesNotFit([Refusal((), "bounds_do_not_go_together", detail, {"given": list(values)})])
        if lower is not None and upper is not None:
            _refuse_crossed(values[lower], values[upper], lower, upper)
        return cls(
            values.get(lower or ""),
            LOWER_BOUNDS.get(lower or "", False),
            values.get(upper or ""),
            UPPER_BOUNDS.get(upper or "", False),
        )


def _refuse_negative(value: Numbers, name: str) -> None:
    if np.all(value >= 0):
        return
    at = (int(np.argmax(value < 0)),) if np.ndim(value) else ()
    given = float(value[at])
    detail = f"{name} must be 0 or more; it is {given:.15g}."
    raise DoesNotFit([Refusal((name, *at), "must_not_be_negative", detail, {"at_least": 0.0, "given": given})])


def _refuse_crossed(low: Numbers, high: Numbers, lower: str, upper: str) -> None:
    crossed = np.asarray(low > high)
    if not crossed.any():
        return
    at = (int(np.argmax(crossed)),) if crossed.ndim else ()
    first, last = (float(np.broadcast_to(bound, crossed.shape)[at]) for bound in (low, high))
    place = at if np.ndim(high) else ()
    detail = f"{upper} ({last:.15g}) lies below {lower} ({first:.15g})."
    raise DoesNotFit([Refusal((upper, *place), "bounds_crossed", detail, {lower: first, upper: last})])


class Chances(NamedTuple):
    """How likely an event is; each figure by its own formula, right down to 1e-300 (logarithms: far beyond).

    Scores are (bound - mean)/standard deviation; None without that bound, nan where a moment has no finite value.
    """

    probability: Numbers
    complement: Numbers
    log_probability: Numbers
    log_complement: Numbers
    lower_score: Numbers | None
    upper_score: Numbers | None


def chances(law: Family, event: Event) -> Chances:
    """Give the probability of an event and of its complement; bounds and parameters broadcast.

    One-sided events are a tail of the law. An interval is the difference of two tails on the side where they are
    smaller, or the integral of the density (the sum of the masses) where that keeps more digits: see `between`.
    """
    with np.errstate(all="ignore"):
        if event.within is not None:
            return within(law, event.within, law.moments())
        mean, spread, _, _ = law.moments()
        # 0 * spread is nan for an infinite spread, which gives no score
        lower = None if event.lower is None else (event.lower - mean) / spread + 0 * spread
        upper = None if event.upper is None else (event.upper - mean) / spread + 0 * spread
        if event.lower is not None and event.upper is not None:
            return Chances(*_two_sided(law, event.lower, event.upper, event), lower, upper)
        if event.upper is not None:
            at_most, above, log_at_most, log_above = _tails(law, event.upper, not event.upper_included)
            return Chances(at_most, above, log_at_most, log_above, lower, upper)
        assert event.lower is not None  # noqa: S101 - `Event.of` admits no event without a bound
        at_most, above, log_at_most, log_above = _tails(law, event.lower, event.lower_included)
        return Chances(above, at_most, log_above, log_at_most, lower, upper)


def _tails(law: Family, bound: Numbers, value_above: bool) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Both tails and their logarithms, cut at the bound; `value_above`: the bound itself counts as above."""
    (at_most, above), (log_at_most, log_above) = law.tails_and_logs(_cut(law, bound, value_above))
    return at_most, above, log_at_most, log_above


def _cut(law: Family, bound: Numbers, value_above: bool) -> Numbers:
    """Give x such that X <= x says on which side of the bound X lies: P(X < b) = P(X <= the double before b)."""
    return np.nextafter(bound, MINUS_INFINITY) if law.discrete and value_above else bound


def _two_sided(law: Family, lower: Numbers, upper: Numbers, event: Event) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    if lower is upper and law.discrete:
        return _exactly(law, lower)
    low = _cut(law, lower, event.lower_included)
    high = _cut(law, upper, not event.upper_included)
    return between(law, low, high)


def _exactly(law: Family, x: Numbers) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Probability of one value of a discrete law, and of every other value."""
    mass = law.density(x)
    complement = law.tails(_cut(law, x, value_above=True)).at_most + law.tails(x).above
    log_rest = np.where(mass < 0.5, np.log1p(-mass), np.log(complement))[()]
    return mass, complement, law.log_density(x), log_rest


def within(law: Family, count: Numbers, moments: Moments) -> Chances:
    """Mean - count sd <= X <= mean + count sd; nan where the law has no finite standard deviation.

    `moments` are the law's own: whoever asks for several counts computes them once. Callers silence numpy.
    """
    mean, spread, _, _ = moments
    has_value = np.isfinite(spread) & np.isfinite(mean)
    reach = np.where(has_value, count * spread, 0)
    centre = np.where(has_value, mean, 0)
    # A value within rounding of an end counts as the end: a lattice point must not be lost to the last bit.
    reach = reach + SLACK * (np.abs(centre) + reach) if law.discrete else reach
    figures = between(law, _cut(law, centre - reach, value_above=True), centre + reach)
    score = np.where(has_value, count, NO_VALUE)[()]
    p, complement, log_p, log_complement = (np.where(has_value, f, NO_VALUE)[()] for f in figures)
    return Chances(p, complement, log_p, log_complement, -score, score)
