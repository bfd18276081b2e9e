"""Money that comes in or goes out at regular times, or once."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import Refusal
from service.core.goals.fitting import WHOLE, refusals_of_limits
from service.core.parameters import Limit

TIMES_A_YEAR = {"month": 12.0, "quarter": 4.0, "year": 1.0, "once": 0.0}
TIMINGS = ("start", "end")


@dataclass(frozen=True, slots=True)
class CashFlow:
    """`amount` at from_year + m p, m = 0, 1, ..., while that lies before to_year (the horizon where None).

    p is a month, a quarter or a year; "once" comes at from_year alone. Below zero it is a withdrawal. With timing "end"
    each comes one p later, the last at to_year or the horizon at the latest. The amount of the period that starts at t
    is multiplied by (1 + yearly_growth)^(whole years in t). `amount` None: to be solved for.
    """

    amount: float | None
    every: str
    from_year: float = 0.0
    to_year: float | None = None
    yearly_growth: float = 0.0
    timing: str = "start"

    @property
    def times_a_year(self) -> float:
        """Times a year, 0 for a single flow (and for a word that is refused)."""
        return TIMES_A_YEAR.get(self.every, 0.0)

    @property
    def at_end(self) -> bool:
        """Whether the flow comes at the end of its period."""
        return self.timing == "end"

    def times(self, horizon_years: float) -> Numbers:
        """Give when the flow comes, in years from the start."""
        starts = self._starts(horizon_years)
        return starts + 1 / self.times_a_year if self.at_end else starts

    def growth(self, horizon_years: float) -> Numbers:
        """Give what the amount is multiplied by, at each of the times."""
        return (1 + self.yearly_growth) ** np.floor(self._starts(horizon_years) + WHOLE)

    def _starts(self, horizon_years: float) -> Numbers:
        end = horizon_years if self.to_year is None else min(self.to_year, horizon_years)
        length = end - self.from_year
        if self.every == "once":
            return np.full(int(length > WHOLE), self.from_year)
        # at the start the last period begins before the end, at the end it is over by then
        periods = length * self.times_a_year
        count = np.floor(periods + WHOLE) if self.at_end else np.ceil(periods - WHOLE)
        return self.from_year + np.arange(max(count, 0.0)) / self.times_a_year

    def refusals(self) -> Iterator[Refusal]:
        """Give what does not fit, paths leading from the flow."""
        for name, value, allowed in (("every", self.every, tuple(TIMES_A_YEAR)), ("timing", self.timing, TIMINGS)):
            if value not in allowed:
                detail = f"{name} is one of {', '.join(allowed)}; it is {value}."
                yield Refusal((name,), "unknown_choice", detail, {"allowed": list(allowed), "given": value})
        yield from refusals_of_limits(
            ("from_year", self.from_year, Limit("at_least", 0)),
            ("yearly_growth", self.yearly_growth, Limit("above", -1)),
        )
        if self.to_year is not None and not self.to_year > self.from_year:
            detail = f"to_year must lie after from_year {self.from_year:.15g}; it is {self.to_year:.15g}."
            yield Refusal(("to_year",), "out_of_order", detail, {"rule": "from_year < to_year"})
        if self.every == "once":
            for name, given in (("to_year", self.to_year is not None), ("timing", self.at_end)):
                if given:
                    detail = f"A single flow comes at from_year; {name} is for flows that repeat."
                    yield Refusal((name,), "does_not_go_together", detail, {"with": "every"})
