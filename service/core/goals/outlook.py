"""Every figure of a plan."""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any, NamedTuple

import numpy as np

from service.core.arrays import Numbers, number
from service.core.goals.evaluation import Evaluation, evaluate
from service.core.goals.growth import discrete
from service.core.goals.plan import Plan
from service.core.goals.sensitivities import Sensitivities, sensitivities
from service.core.goals.wealth import Wealth
from service.core.goals.work import Work
from service.core.portfolio.frequencies import RESOLVED, Frequencies, frequencies

BANDS = (0.05, 0.25, 0.5, 0.75, 0.95)
NOTICEABLE = 1e-9
NOTICEABLE_LOSS = 1e-12
MAY_LIVE = 0.01
"""Above this probability of being alive at the horizon it is said."""


class Caution(NamedTuple):
    """What a reader of the figures has to know: a listed code, and figures for its words."""

    code: str
    params: dict[str, Any] = {}  # noqa: RUF012 - never changed


class Band(NamedTuple):
    """Lower quantiles of wealth at each year, at one probability."""

    probability: float
    wealth: Numbers


class ByYear(NamedTuple):
    """Figures at the years 0, 1, 2, ... and the horizon: before that year's flow, at the horizon after it."""

    year: Numbers
    depletion_probability: Numbers
    expected_wealth: Numbers
    bands: tuple[Band, ...]


class MoneyLasts(NamedTuple):
    """Years until depleted with this probability, nan where the horizon comes first."""

    probability: float
    years: float


class AtTarget(NamedTuple):
    """The figures of one target."""

    target: float
    success_probability: float
    solvent_below_target_probability: float
    expected_gap: float
    mean_gap_if_missed: float


@dataclass(frozen=True)
class Outlook:
    """The figures; those of the first target stand at the top. A figure without a value is nan, an infinite one inf.

    `lifetime_depletion_probability` and `alive_at_horizon` are None without a lifetime, `sensitivities` and `outcomes`
    where not asked for. `frequencies` by the name of the figure. `numerical_error` is that of every probability.
    """

    success_probability: float
    depletion_probability: float
    solvent_below_target_probability: float
    frequencies: dict[str, Frequencies]
    expected_gap: float
    mean_gap_if_missed: float
    expected_wealth: float
    by_year: ByYear
    money_lasts: tuple[MoneyLasts, ...]
    lifetime_depletion_probability: float | None
    alive_at_horizon: float | None
    by_target: tuple[AtTarget, ...]
    sensitivities: Sensitivities | None
    outcomes: Numbers | None
    method: str
    numerical_error: float
    numerical_error_kind: str
    cautions: tuple[Caution, ...]


def outlook(plan: Plan, with_sensitivities: bool = False, outcomes_count: int | None = None) -> Outlook:
    """Give every figure of a complete plan; `outcomes_count` asks for so many equally likely outcomes.

    Raises DoesNotFit, paths leading from the request.
    """
    plan.complete()
    work = Work()
    with np.errstate(all="ignore"):
        found = evaluate(plan, work)
        figures = _figures(plan, found, outcomes_count)
        if with_sensitivities:
            figures = replace(figures, sensitivities=sensitivities(plan, figures.success_probability, work))
        return replace(figures, cautions=tuple(_cautions(plan, found, figures)))


def _figures(plan: Plan, found: Evaluation, outcomes_count: int | None) -> Outlook:
    course, error = found.course, found.numerical_error
    last = found.timeline.dates.size - 1
    wealth = course.wealth[last]
    depleted = course.depletion_probability()
    targets = tuple(_at_target(target, wealth, depleted, error) for target in plan.targets)
    first = targets[0]
    alive = None if plan.lifetime is None else plan.lifetime.survival(found.timeline.dates)
    outcomes = None if outcomes_count is None else (np.arange(outcomes_count) + 0.5) / outcomes_count
    return Outlook(
        success_probability=first.success_probability,
        depletion_probability=depleted,
        solvent_below_target_probability=first.solvent_below_target_probability,
        frequencies={
            name: frequencies(number(value), np.asarray(value in (0.0, 1.0)), error)
            for name, value in (("success_probability", first.success_probability), ("depletion_probability", depleted))
        },
        expected_gap=first.expected_gap,
        mean_gap_if_missed=first.mean_gap_if_missed,
        expected_wealth=float(course.expected[last]),
        by_year=_by_year(found),
        money_lasts=_money_lasts(found),
        lifetime_depletion_probability=None if alive is None else float((course.unpaid + course.lost) @ alive),
        alive_at_horizon=None if alive is None else float(alive[-1]),
        by_target=targets,
        sensitivities=None,
        outcomes=None if outcomes is None else wealth.quantiles(outcomes),
        method=course.method,
        numerical_error=error,
        numerical_error_kind="estimate",
        cautions=(),
    )


def _at_target(target: float, wealth: Wealth, depleted: float, error: float) -> AtTarget:
    success = wealth.solvent_at_least(target)
    gap = wealth.gap(target)
    missed = 1 - success
    mean_gap = gap / missed if missed > RESOLVED * error else np.nan
    return AtTarget(target, success, max(missed - depleted, 0.0), gap, mean_gap)


def _by_year(found: Evaluation) -> ByYear:
    years, course = found.timeline.years, found.course
    depleted = course.depleted()[years]
    depleted[-1] = course.depletion_probability()
    levels = np.array(BANDS)
    wealth = np.array([course.wealth[int(year)].quantiles(levels) for year in years])
    bands = tuple(Band(level, wealth[:, index]) for index, level in enumerate(BANDS))
    return ByYear(found.timeline.dates[years], depleted, course.expected[years], bands)


def _money_lasts(found: Evaluation) -> tuple[MoneyLasts, ...]:
    """Give the earliest date at or before which the plan is depleted with each probability."""
    cumulative = np.cumsum(found.course.unpaid + found.course.lost)
    at = np.searchsorted(cumulative, np.array(BANDS))
    dates = np.append(found.timeline.dates, np.nan)
    return tuple(MoneyLasts(level, float(dates[index])) for level, index in zip(BANDS, at, strict=True))


def _cautions(plan: Plan, found: Evaluation, figures: Outlook) -> Iterator[Caution]:
    """Say what a reader of these figures has to know."""
    yield Caution("success_hides_size")
    yield Caution("bands_are_not_paths")
    median = figures.by_year.bands[BANDS.index(0.5)].wealth[-1]
    if figures.expected_wealth > median:
        yield Caution("mean_above_typical")
    if any((flow.amount or 0.0) < 0 for flow in plan.cash_flows):
        yield Caution("same_spending_whatever_happens")
    if plan.inflation_rate != 0:
        yield Caution("steady_inflation")
    if plan.parameter_uncertainty == "ignored":
        yield Caution("estimates_taken_as_true")
    if found.course.lost.sum() > NOTICEABLE_LOSS:
        yield Caution("growth_below_zero", {"total_loss_probability": float(found.course.lost.sum())})
    if found.course.method == "lattice_fourier" and discrete(plan) and figures.numerical_error > NOTICEABLE:
        yield Caution("discrete_law_approximated", {"numerical_error": figures.numerical_error})
    if figures.alive_at_horizon is not None and figures.alive_at_horizon > MAY_LIVE:
        yield Caution("life_beyond_horizon", {"alive_at_horizon": figures.alive_at_horizon})
