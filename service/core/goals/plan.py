"""A plan: what is there, what comes in and goes out, how it grows, and what it shall reach."""

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from service.core.errors import DoesNotFit, Refusal
from service.core.goals.cash_flow import CashFlow
from service.core.goals.fitting import placed_under, refusals_of_limits
from service.core.goals.lifetime import GompertzLife, Lifetime, TableLife
from service.core.parameters import Limit
from service.core.returns import Returns

MOST_STEPS = 40_000
"""Steps of the shortest period within the horizon: beyond, the tables of dates alone would be long."""
UNCERTAINTIES = ("ignored", "predictive")

__all__ = ["CashFlow", "GompertzLife", "Leg", "Lifetime", "Plan", "Shock", "TableLife"]


@dataclass(frozen=True, slots=True)
class Leg:
    """How money grows until a year of the plan; `until_year` is None where one law serves throughout."""

    until_year: float | None
    returns: Returns


@dataclass(frozen=True, slots=True)
class Shock:
    """In the step that starts at `at_year`, after its flow, wealth is multiplied by 1 + `return_`."""

    at_year: float
    return_: float


@dataclass(frozen=True)
class Plan:
    """The plan as asked; money in one currency, with `inflation_rate` all of it in today's money.

    One leg with until_year None stands for "returns", several for "glide_path": a step that starts at t grows by the
    first leg with t < until_year. What a requirement solves for is None (`targets`: empty). Raises DoesNotFit with
    everything that does not fit, paths leading from the request's fields.
    """

    initial_value: float | None
    cash_flows: tuple[CashFlow, ...]
    horizon_years: float | None
    targets: tuple[float, ...]
    legs: tuple[Leg, ...]
    inflation_rate: float = 0.0
    yearly_fee: float = 0.0
    lifetime: Lifetime | None = None
    shock: Shock | None = None
    parameter_uncertainty: str = "ignored"

    def __post_init__(self) -> None:
        refusals = list(self._refusals())
        if refusals:
            raise DoesNotFit(refusals)

    @property
    def glides(self) -> bool:
        """Whether the growth is given as a glide path."""
        return self.legs[0].until_year is not None

    def leg_path(self, index: int) -> tuple[str | int, ...]:
        """Give where the returns of a leg stand in the request."""
        return ("glide_path", index, "returns") if self.glides else ("returns",)

    def target_path(self, index: int) -> tuple[str | int, ...]:
        """Give where a target stands in the request."""
        return ("targets", index) if len(self.targets) > 1 else ("target",)

    def complete(self) -> "Plan":
        """Give the plan itself, or refuse one with something left open. Raises DoesNotFit."""
        missing: list[tuple[str | int, ...]] = []
        if self.initial_value is None:
            missing.append(("initial_value",))
        if self.horizon_years is None:
            missing.append(("horizon_years",))
        if not self.targets:
            missing.append(("target",))
        missing += [("cash_flows", i, "amount") for i, flow in enumerate(self.cash_flows) if flow.amount is None]
        if missing:
            raise DoesNotFit(Refusal(path, "required", f"{path[-1]} is needed.") for path in missing)
        return self

    def _refusals(self) -> Iterator[Refusal]:
        yield from self._numbers()
        for index, flow in enumerate(self.cash_flows):
            yield from placed_under(("cash_flows", index), flow.refusals())
        yield from self._glide_path()
        yield from self._uncertainty()
        yield from self._shock()
        if self.lifetime:
            yield from self.lifetime.refusals(self.horizon_years)

    def _numbers(self) -> Iterator[Refusal]:
        yield from refusals_of_limits(
            ("initial_value", self.initial_value, Limit("at_least", 0)),
            ("horizon_years", self.horizon_years, Limit("above", 0)),
            ("inflation_rate", self.inflation_rate, Limit("above", -1)),
            ("yearly_fee", self.yearly_fee, Limit("at_least", 0)),
            ("yearly_fee", self.yearly_fee, Limit("below", 1)),
        )
        for index, target in enumerate(self.targets):
            found = refusals_of_limits(("target", target, Limit("at_least", 0)))
            yield from (Refusal(self.target_path(index), one.code, one.detail, one.params) for one in found)
        if self.horizon_years is not None:
            steps = self.horizon_years * self.steps_a_year()
            if steps > MOST_STEPS:
                detail = f"The horizon has {steps:.0f} steps; at most {MOST_STEPS} are computed. Use longer periods."
                yield Refusal(("horizon_years",), "too_much_work", detail, {"work": steps, "limit": MOST_STEPS})

    def steps_a_year(self) -> float:
        """Give the steps a year, by the shortest period among flows and returns."""
        return max(*(leg.returns.periods_in_year for leg in self.legs), *(f.times_a_year for f in self.cash_flows), 0.0)

    def _glide_path(self) -> Iterator[Refusal]:
        if not self.glides:
            return
        ends = [0.0, *(np.inf if leg.until_year is None else leg.until_year for leg in self.legs)]
        for index, (before, end) in enumerate(pairwise(ends)):
            if not end > before:
                detail = f"until_year must rise along the glide path; {end:.15g} follows {before:.15g}."
                yield Refusal(("glide_path", index, "until_year"), "out_of_order", detail, {"rule": "rising"})
        if self.horizon_years is not None and ends[-1] < self.horizon_years * (1 - 1e-12):
            detail = f"The glide path ends at {ends[-1]:.15g}, before the horizon of {self.horizon_years:.15g} years."
            last = len(self.legs) - 1
            params = {"at_least": self.horizon_years, "given": ends[-1]}
            yield Refusal(("glide_path", last, "until_year"), "must_be_at_least", detail, params)

    def _uncertainty(self) -> Iterator[Refusal]:
        if self.parameter_uncertainty not in UNCERTAINTIES:
            detail = f"parameter_uncertainty is one of {', '.join(UNCERTAINTIES)}."
            params = {"allowed": list(UNCERTAINTIES), "given": self.parameter_uncertainty}
            yield Refusal(("parameter_uncertainty",), "unknown_choice", detail, params)
        if self.parameter_uncertainty != "predictive":
            return
        for index, leg in enumerate(self.legs):
            returns, path = leg.returns, self.leg_path(index)
            if returns.compounding not in returns.model.predictive:
                detail = "The uncertainty of the estimates can be included for the models normal and lognormal alone."
                params = {"model": returns.model.name, "compounding": returns.compounding}
                yield Refusal(("parameter_uncertainty",), "predictive_not_available", detail, params)
            elif returns.sample_size is None:
                detail = (
                    "sample_size, the number of periods behind the estimates, is needed to include their uncertainty."
                )
                yield Refusal((*path, "sample_size"), "required", detail, {"by": "parameter_uncertainty"})
            else:
                limit = Limit("at_least", 2)
                yield from placed_under(path, refusals_of_limits(("sample_size", float(returns.sample_size), limit)))

    def _shock(self) -> Iterator[Refusal]:
        if self.shock is None:
            return
        at = self.shock.at_year
        bounds = refusals_of_limits(
            ("at_year", at, Limit("at_least", 0)),
            ("at_year", at, Limit("below", np.inf if self.horizon_years is None else self.horizon_years)),
            ("return", self.shock.return_, Limit("above", -1)),
        )
        yield from placed_under(("shock",), bounds)
