"""How the chance of success answers to a change in one thing."""

from collections.abc import Callable
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.core.goals.evaluation import chance
from service.core.goals.plan import Leg, Plan
from service.core.goals.work import Work
from service.core.returns import Returns

MEAN, RISK, MORE, YEARS = 0.01, 0.01, 1.1, 1.0


class Sensitivities(NamedTuple):
    """Changes of the success probability at the first target; nan where one cannot be computed.

    expected_return and volatility + 0.01 a year, contributions times 1.1, the horizon a year longer with the flows that
    last until the horizon prolonged.
    """

    expected_return: float
    volatility: float
    contributions: float
    horizon_years: float


def sensitivities(plan: Plan, success: float, work: Work) -> Sensitivities:
    """Compute the plan again with each thing changed."""

    def change(changed: Callable[[Plan], Plan | None]) -> float:
        try:
            other = changed(plan)
            return np.nan if other is None else chance(other, False, work) - success
        except DoesNotFit:
            return np.nan

    return Sensitivities(change(_more_return), change(_more_risk), change(_more_contributions), change(_a_year_longer))


def _more_return(plan: Plan) -> Plan | None:
    return _with_returns(plan, lambda returns: ("expected_return", MEAN / returns.periods_in_year))


def _more_risk(plan: Plan) -> Plan | None:
    return _with_returns(plan, lambda returns: ("volatility", RISK / np.sqrt(returns.periods_in_year)))


def _with_returns(plan: Plan, step: Callable[[Returns], tuple[str, float]]) -> Plan | None:
    """Raise a parameter of every leg's returns; None where a model has no such parameter."""
    legs = []
    for leg in plan.legs:
        name, more = step(leg.returns)
        parameters = vars(leg.returns.model)
        if name not in parameters:
            return None
        model = type(leg.returns.model)(**{**parameters, name: parameters[name] + number(more)})
        legs.append(Leg(leg.until_year, replace(leg.returns, model=model)))
    return replace(plan, legs=tuple(legs))


def _more_contributions(plan: Plan) -> Plan:
    amounts = [flow.amount or 0.0 for flow in plan.cash_flows]
    flows = tuple(
        replace(flow, amount=MORE * amount) if amount > 0 else flow
        for flow, amount in zip(plan.cash_flows, amounts, strict=True)
    )
    return replace(plan, cash_flows=flows)


def _a_year_longer(plan: Plan) -> Plan:
    horizon = plan.horizon_years or 0.0
    flows = tuple(
        replace(flow, to_year=None) if flow.to_year is not None and abs(flow.to_year - horizon) < 1e-9 else flow
        for flow in plan.cash_flows
    )
    last = plan.legs[-1]
    end = None if last.until_year is None else max(last.until_year, horizon + YEARS)
    legs = (*plan.legs[:-1], Leg(end, last.returns))
    return replace(plan, horizon_years=horizon + YEARS, cash_flows=flows, legs=legs, lifetime=None)
