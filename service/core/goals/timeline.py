"""The dates of a plan and the money that changes hands at each."""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit, Refusal
from service.core.goals.fitting import WHOLE
from service.core.goals.plan import Plan

Indices = npt.NDArray[np.int64]
SAME_LENGTH = 1e-11


@dataclass(frozen=True)
class Timeline:
    """Dates in years, 0 first and the horizon last: everything that happens or is reported happens at one of them.

    `flows`: what comes in (above 0) and goes out at each date, all flows of a date together; `closing`: the part that
    comes at the end of a period, the only one that still counts where the plan ends. `lengths`: years to the next date.
    """

    dates: Numbers
    flows: Numbers
    closing: Numbers
    lengths: Numbers
    years: Indices
    """Positions of the dates 0, 1, 2, ... years, and of the horizon."""

    def position(self, year: float) -> int:
        """Give the position of a date."""
        return int(np.argmin(np.abs(self.dates - year)))


def timeline(plan: Plan, more_dates: Iterable[float] = ()) -> Timeline:
    """Lay out a complete plan; `more_dates`, within the horizon, become dates too."""
    horizon = plan.horizon_years or 0.0
    times = [flow.times(horizon) for flow in plan.cash_flows]
    ends = [leg.until_year for leg in plan.legs if leg.until_year is not None and leg.until_year < horizon]
    whole_years = _reportable(plan, np.arange(np.floor(horizon - WHOLE) + 1))
    shock = [] if plan.shock is None else [plan.shock.at_year]
    dates = _distinct(np.concatenate([whole_years, [horizon], *times, ends, shock, np.fromiter(more_dates, float)]))
    opening, closing = np.zeros(dates.size), np.zeros(dates.size)
    for index, (flow, at) in enumerate(zip(plan.cash_flows, times, strict=True)):
        with np.errstate(over="ignore", invalid="ignore"):
            amounts = (flow.amount or 0.0) * flow.growth(horizon)
        _refuse_beyond_doubles(index, amounts)
        np.add.at(closing if flow.at_end else opening, _positions(dates, at), amounts)
    years = np.append(_positions(dates, whole_years), dates.size - 1)
    return Timeline(dates, opening + closing, closing, _alike(np.diff(dates)), years)


def _reportable(plan: Plan, years: Numbers) -> Numbers:
    """Leave out the years that lie within a period of returns longer than a year."""
    for leg in plan.legs:
        if leg.returns.compounding not in leg.returns.model.divides:
            periods = years * leg.returns.periods_in_year
            years = years[np.abs(periods - np.rint(periods)) <= WHOLE * leg.returns.periods_in_year]
    return years


def _refuse_beyond_doubles(index: int, amounts: Numbers) -> None:
    if not np.isfinite(amounts).all():
        detail = "The growth of the cash flow leaves what a double can hold."
        raise DoesNotFit([Refusal(("cash_flows", index, "yearly_growth"), "not_representable", detail)])


def _distinct(times: Numbers) -> Numbers:
    """Sort times and keep one of those that differ by rounding alone: a whole number of years where there is one."""
    whole = np.rint(times)
    times = np.unique(np.where(np.abs(times - whole) <= WHOLE, whole, times))
    kept = np.concatenate([[True], np.diff(times) > WHOLE])
    found: Numbers = times[kept]
    return found


def _positions(dates: Numbers, times: Numbers) -> Indices:
    """Give the position of the nearest date for each time."""
    right = np.clip(np.searchsorted(dates, times), 1, dates.size - 1)
    nearer_left = times - dates[right - 1] < dates[right] - times
    return np.where(nearer_left, right - 1, right)


def _alike(lengths: Numbers) -> Numbers:
    """Make lengths that differ by rounding alone equal, so that what is computed for one serves for all."""
    order = np.argsort(lengths)
    groups = np.concatenate([[0], np.cumsum(np.diff(lengths[order]) > SAME_LENGTH)])
    means = np.bincount(groups, lengths[order]) / np.bincount(groups)
    alike = np.empty_like(lengths)
    alike[order] = means[groups]
    return alike
