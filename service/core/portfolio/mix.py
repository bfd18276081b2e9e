"""The best mix of shared assets against a floor: from a question to weights."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import ndtri, stdtrit

from service.core.arrays import Numbers, number
from service.core.errors import DoesNotFit, Refusal
from service.core.portfolio.allocation import OBJECTIVES, Allocation, allocate
from service.core.portfolio.assets import Assets
from service.core.portfolio.floor import Floor
from service.core.returns import PERIODS_PER_YEAR, RETURN_MODELS, Returns

RISK_FREE = "risk_free"


@dataclass(frozen=True)
class MixQuestion:
    """Which mix: `limit` is the greatest chance of missing the floor (expected_return), `risk_free_rate` is per year.

    `weight_limits`: rows with `asset` and `least` or `most` or both.
    """

    objective: str
    threshold: float
    basis: str = "per_year"
    limit: float | None = None
    quantile_probability: float = 0.05
    weight_limits: Sequence[Mapping[str, Any]] = ()
    risk_free_rate: float | None = None


@dataclass(frozen=True)
class Mix:
    """The weights by asset (the riskless one last), the returns of the mix, and how exactly it is best."""

    names: tuple[str, ...]
    weights: Numbers
    returns: Returns
    kkt_violation: float


def best_mix(assets: Assets, question: MixQuestion) -> Mix:
    """Find the best long-only mix for a floor of one period. Raises DoesNotFit; paths lead from the question."""
    if assets.model == "lognormal":
        words = "Mixes are found for the models normal and student_t, whose law is exact for every mix."
        raise DoesNotFit(
            [Refusal(("assets", "model"), "model_not_available", words, {"available": ["normal", "student_t"]})]
        )
    periods = 1 / one_period(assets)
    floor = _floor_of_one_period(question, periods)
    z = standard_deviations(assets, _tail(question))
    pool = _with_riskless(assets, question, periods, floor)
    least, most = _limits(pool.names, question.weight_limits)
    found = allocate(question.objective, pool.means, pool.covariance, floor, z, least, most)
    return Mix(pool.names, found.weights, _returns(assets, found), found.kkt_violation)


def one_period(assets: Assets) -> float:
    """Give the length of one period of the assets, in years."""
    return 1 / (assets.periods_per_year or PERIODS_PER_YEAR[assets.period])


@dataclass(frozen=True, slots=True)
class Pool:
    """What may be mixed."""

    names: tuple[str, ...]
    means: Numbers
    covariance: Numbers


def _floor_of_one_period(question: MixQuestion, periods: float) -> float:
    floor = Floor(number(question.threshold), question.basis, 1 / periods)
    return float(floor.over_horizon())


def _tail(question: MixQuestion) -> float:
    """Give the probability whose quantile the objective looks at, below one half."""
    if question.objective == "expected_return":
        if question.limit is None:
            words = "limits with a shortfall_probability are needed by the objective expected_return."
            raise DoesNotFit([Refusal(("limits",), "required", words, {"by": "expected_return"})])
        tail, path = question.limit, ["limits", "shortfall_probability"]
    else:
        tail, path = question.quantile_probability, ["quantile_probability"]
    if not 0 < tail < 0.5 and question.objective != "safety_first_ratio":
        words = f"The method is for probabilities between 0 and 0.5; it is {tail:.6g}."
        raise DoesNotFit(
            [Refusal(tuple(path), "probability_not_below_half", words, {"above": 0, "below": 0.5, "given": tail})]
        )
    return tail


def standard_deviations(assets: Assets, tail: float) -> float:
    """Give how many standard deviations below the mean the quantile of every mix lies."""
    if assets.degrees_of_freedom is None:
        return -float(ndtri(tail))
    freedom = assets.degrees_of_freedom
    return -float(stdtrit(freedom, tail)) * float(np.sqrt((freedom - 2) / freedom))


def _with_riskless(assets: Assets, question: MixQuestion, periods: float, floor: float) -> Pool:
    rate = question.risk_free_rate
    if rate is None:
        return Pool(assets.names, assets.expected_returns, assets.covariance)
    if RISK_FREE in assets.names:
        words = f"An asset of the name {RISK_FREE} cannot stand beside risk_free_rate, which adds one."
        raise DoesNotFit([Refusal(("assets", "names", assets.names.index(RISK_FREE)), "given_twice", words)])
    riskless = float(Floor(number(rate), "per_year", 1 / periods).over_horizon())
    if floor <= riskless:
        words = "The floor does not lie above the riskless rate: keeping the money there never misses it."
        raise DoesNotFit(
            [Refusal(("threshold",), "threshold_without_risk", words, {"floor": floor, "riskless": riskless})]
        )
    count = len(assets.names)
    covariance = np.zeros((count + 1, count + 1))
    covariance[:count, :count] = assets.covariance
    return Pool((*assets.names, RISK_FREE), np.append(assets.expected_returns, riskless), covariance)


def _limits(names: tuple[str, ...], rows: Sequence[Mapping[str, Any]]) -> tuple[Numbers, Numbers]:
    least, most = np.zeros(len(names)), np.ones(len(names))
    places = {name: at for at, name in enumerate(names)}
    refusals, seen = [], set()
    for row_at, row in enumerate(rows):
        name, path = row["asset"], ("weight_limits", row_at)
        if name not in places:
            refusals.append(Refusal((*path, "asset"), "unknown_asset", f"There is no asset {name[:60]} under assets."))
            continue
        if name in seen:
            refusals.append(Refusal((*path, "asset"), "given_twice", f"The asset {name[:60]} stands twice."))
        seen.add(name)
        low, high = row.get("least", 0.0), row.get("most", 1.0)
        if low > high:
            words = f"least <= most is needed; they are {low:.6g} and {high:.6g}."
            refusals.append(Refusal((*path, "most"), "out_of_order", words, {"least": low, "most": high}))
        least[places[name]], most[places[name]] = low, high
    if refusals:
        raise DoesNotFit(refusals)
    return least, most


def _returns(assets: Assets, found: Allocation) -> Returns:
    """Give the returns of the mix; what is riskless only narrows the law."""
    values = {"expected_return": number(found.mean), "volatility": number(found.standard_deviation)}
    if assets.degrees_of_freedom is not None:
        values["degrees_of_freedom"] = number(assets.degrees_of_freedom)
    kind = RETURN_MODELS[assets.model]
    return Returns(
        kind.make(kind.parameterisations[0], values),
        assets.period,
        assets.periods_per_year,
        sample_size=assets.sample_size,
    )


__all__ = ["OBJECTIVES", "Mix", "MixQuestion", "best_mix"]
