"""From the returns of a plan to the growth between its dates."""

from collections.abc import Iterator

import numpy as np

from service.core.arrays import Numbers
from service.core.errors import DoesNotFit, Refusal
from service.core.goals.course import Growth
from service.core.goals.fitting import WHOLE
from service.core.goals.lattice_growth import BAND, LatticeGrowth
from service.core.goals.normal_growth import NormalGrowth
from service.core.goals.plan import Leg, Plan
from service.core.goals.quadrature import Quadrature
from service.core.goals.step_law import StepLaw, step_law
from service.core.goals.step_transform import StepTransform
from service.core.goals.timeline import Indices, Timeline
from service.core.returns import law_of_horizon


def divides(leg: Leg) -> bool:
    """Whether the law of the leg is known over any length of time: then its log growth is normal."""
    return leg.returns.compounding in leg.returns.model.divides


def discrete(plan: Plan) -> bool:
    """Whether growth takes single values, in some leg."""
    return any(not divides(leg) and step_law(leg.returns).law.discrete for leg in plan.legs)


def growth_of(plan: Plan, dates: Timeline, quadrature: Quadrature, surprise: float, coarser: float) -> Growth:
    """Give the growth from each date to the next, after fee and inflation, in today's money.

    `surprise`: by how many standard errors the true mean per period exceeds the estimate. `coarser`: by what factor the
    lattice, for laws that need one, is coarser. Raises DoesNotFit.
    """
    drift = drifts(plan, dates)
    if all(divides(leg) for leg in plan.legs):
        legs = legs_of(plan, dates)
        means, variances = np.array([_per_year(plan, leg, surprise) for leg in plan.legs]).T
        return NormalGrowth(means[legs] * dates.lengths + drift, variances[legs] * dates.lengths)
    laws, kinds, periods = step_laws(plan, dates, surprise)
    steps = max(int(periods.sum()), 1)
    transforms = tuple(StepTransform.of(law, steps) for law in laws)
    # one lattice for every surprise, so that what follows from each can be mixed
    expected = transforms if surprise == 0 else [StepTransform.of(law, steps) for law in step_laws(plan, dates)[0]]
    h = coarser * BAND * np.pi / (max(transform.highest for transform in expected) or 1.0)
    return LatticeGrowth(transforms, kinds, periods, drift, quadrature, float(h))


def step_laws(plan: Plan, dates: Timeline, surprise: float = 0.0) -> tuple[list[StepLaw], Indices, Indices]:
    """Give the laws of one period that occur, which of them rules from each date to the next, and for how many periods.

    A law that divides has a period of its own for every length of time.
    """
    legs, periods = legs_of(plan, dates), periods_of(plan, dates)
    own = np.array([divides(leg) for leg in plan.legs])[legs]
    years = np.where(own, dates.lengths, 0.0)
    kinds, places = np.unique(np.stack([legs, years], axis=-1), axis=0, return_inverse=True)
    laws = [step_law(plan.legs[int(leg)].returns, float(length), surprise) for leg, length in kinds]
    return laws, np.asarray(places, np.int64).ravel(), periods


def legs_of(plan: Plan, dates: Timeline) -> Indices:
    """Give the position of the leg that rules from each date to the next."""
    ends = np.array([np.inf if leg.until_year is None else leg.until_year for leg in plan.legs[:-1]])
    return np.asarray(np.searchsorted(ends, dates.dates[:-1] + WHOLE), np.int64)


def drifts(plan: Plan, dates: Timeline) -> Numbers:
    """Give the certain part of log growth from each date to the next: fee, inflation, and a shock in its step."""
    drift: Numbers = dates.lengths * (np.log1p(-plan.yearly_fee) - np.log1p(plan.inflation_rate))
    if plan.shock is not None:
        drift[dates.position(plan.shock.at_year)] += np.log1p(plan.shock.return_)
    return drift


def periods_of(plan: Plan, dates: Timeline) -> Indices:
    """Give the whole number of periods from each date to the next, by the leg that rules, or refuse."""
    densities = np.array([leg.returns.periods_in_year for leg in plan.legs])[legs_of(plan, dates)]
    own = np.array([divides(leg) for leg in plan.legs])[legs_of(plan, dates)]
    periods = np.where(own, 1.0, dates.lengths * densities)
    whole = np.rint(periods)
    unfit = (np.abs(periods - whole) > WHOLE * densities) | (whole < 1)
    if unfit.any():
        raise DoesNotFit(_misfits(plan, dates, int(np.argmax(unfit))))
    return np.asarray(whole, np.int64)


def _misfits(plan: Plan, dates: Timeline, at: int) -> Iterator[Refusal]:
    """Name what stands at a time that is no whole number of periods."""
    index = int(legs_of(plan, dates)[at])
    returns, horizon = plan.legs[index].returns, plan.horizon_years or 0.0
    a_year = returns.periods_in_year
    detail = (
        f"Periods in a year: {a_year:.6g}. The law of {returns.model.name} returns does not divide, so every "
        "cash flow, the horizon, the ends of a glide path and a shock must come after whole periods. Give "
        "returns estimated for the shortest time between flows, or a law that divides: lognormal, or normal with "
        "continuous compounding."
    )
    params = {"model": returns.model.name, "periods_per_year": a_year}
    places: list[tuple[tuple[str | int, ...], Numbers]] = [
        (("cash_flows", i, "every"), flow.times(horizon)) for i, flow in enumerate(plan.cash_flows)
    ]
    places.append((("horizon_years",), np.array([horizon])))
    for i, leg in enumerate(plan.legs[:-1]):
        places.append((("glide_path", i, "until_year"), np.array([leg.until_year or 0.0])))
    if plan.shock:
        places.append((("shock", "at_year"), np.array([plan.shock.at_year])))
    found = [path for path, times in places if not fits(times, a_year)]
    for path in found or [plan.leg_path(index)]:
        yield Refusal(path, "periods_do_not_fit", detail, params)


def fits(times: Numbers, a_year: float) -> bool:
    """Whether all times come after whole periods."""
    periods = times * a_year
    return bool((np.abs(periods - np.rint(periods)) <= WHOLE * a_year).all())


def _per_year(plan: Plan, leg: Leg, surprise: float) -> tuple[float, float]:
    """Mean and variance of log growth per year, where the law divides."""
    returns = leg.returns
    mean, deviation = (float(figure) for figure in law_of_horizon(returns, 1.0).log_growth())
    if plan.parameter_uncertainty == "predictive":
        mean += surprise * deviation * float(np.sqrt(returns.periods_in_year / float(returns.sample_size or np.inf)))
    return mean, deviation**2
