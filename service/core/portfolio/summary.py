"""A ranking in one or two plain sentences, made from its figures; no advice."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Truths
from service.core.portfolio.criteria import CRITERIA
from service.core.portfolio.floor import Floor
from service.core.portfolio.frequencies import Frequencies
from service.core.portfolio.question import RankingQuestion
from service.core.returns.laws.collected import Positions

PROBABILITY_LIKE = ("safety_first_ratio", "shortfall_probability")
HORIZONS = {1.0: "years", 1 / 4: "quarters", 1 / 12: "months", 1 / 52: "weeks", 1 / 252: "days"}
BOUNDS = {"about": "about", "at_most": "at most", "at_least": "at least", "exactly": "exactly"}
BOTH = 2


@dataclass(frozen=True)
class Outcome:
    """What a summary is made of, in the order of the question."""

    question: RankingQuestion
    order: Positions
    ranks: Positions
    probability_ranks: Positions
    admissible: Truths
    frequencies: Frequencies
    name: Callable[..., str]
    """From a position, and whether the name opens a sentence."""


def summary(outcome: Outcome) -> str:
    """One sentence on the first portfolio, and a second one where another misses the floor less often."""
    count = outcome.order.size
    floor = _floor(outcome.question.floor)
    best = int(outcome.order[0])
    rarest = int(np.flatnonzero(outcome.probability_ranks == 1)[0])
    if count == 1:
        limit = "" if outcome.admissible.any() else ", more often than the limit allows"
        return f"{outcome.name(best, opening=True)} misses {floor} {_often(outcome, best)}{limit}."
    if not outcome.admissible.any():
        return f"None of these {count} keeps within the limit. {_rarest(outcome, rarest, floor)}"
    leaders = np.flatnonzero(outcome.ranks == 1)
    if not leaders.size:
        noun = CRITERIA[outcome.question.criterion].noun
        return f"None of these {count} has a {noun}. {_rarest(outcome, rarest, floor)}"
    if outcome.admissible.sum() == 1:
        often = _often(outcome, best)
        return f"Of these {count}, only {outcome.name(best)} keeps within the limit: it misses {floor} {often}."
    if outcome.question.criterion in PROBABILITY_LIKE and (outcome.probability_ranks[leaders] == 1).all():
        return _least_often(outcome, leaders, floor)
    return _by_criterion(outcome, leaders, rarest, floor)


def _least_often(outcome: Outcome, leaders: Positions, floor: str) -> str:
    often = _often(outcome, int(leaders[0]))
    if leaders.size == outcome.order.size:
        return f"All of these {leaders.size} miss {floor} equally often: {often}."
    verb, each = ("misses", "") if leaders.size == 1 else ("miss", "each ")
    return f"{_among(outcome)}, {_names(outcome, leaders)} {verb} {floor} least often: {each}{often}."


def _by_criterion(outcome: Outcome, leaders: Positions, rarest: int, floor: str) -> str:
    question = outcome.question
    superlative = CRITERIA[question.criterion].superlative.format(
        floor=floor,
        probability=_percent(question.quantile_probability),
        horizon="such " + _periods(question.floor.horizon_years),
    )
    verb = "has" if leaders.size == 1 else "have"
    first, best = f"{_among(outcome)}, {_names(outcome, leaders)} {verb} the {superlative}", int(leaders[0])
    subject = "it" if leaders.size == 1 else outcome.name(best)
    sentence = f"{first}; {subject} misses {_again(question, floor)} {_often(outcome, best)}."
    if outcome.probability_ranks[best] == 1:
        return sentence
    return f"{sentence} {_rarest(outcome, rarest, 'it')}"


def _again(question: RankingQuestion, floor: str) -> str:
    """The floor, in full where the superlative has not named it."""
    return "that floor" if "{floor}" in CRITERIA[question.criterion].superlative else floor


def _rarest(outcome: Outcome, rarest: int, floor: str) -> str:
    return f"{outcome.name(rarest, opening=True)} misses {floor} least often: {_often(outcome, rarest)}."


def _among(outcome: Outcome) -> str:
    count, admissible = outcome.order.size, int(outcome.admissible.sum())
    if admissible == count:
        return f"Of these {count}"
    return f"Of the {admissible} of these {count} within the limit"


def _names(outcome: Outcome, leaders: Positions) -> str:
    first = outcome.name(int(leaders[0]))
    if leaders.size == 1:
        return first
    if leaders.size == BOTH:
        return f"{first} and {outcome.name(int(leaders[1]))}"
    return f"{first} and {leaders.size - 1} others"


def _often(outcome: Outcome, index: int) -> str:
    found = outcome.frequencies
    bound = BOUNDS[str(found.bound[index])]
    periods = _periods(outcome.question.floor.horizon_years)
    return f"in {bound} {int(found.count[index]):,} of {int(found.out_of[index]):,} such {periods}"


def _floor(floor: Floor) -> str:
    amount = f"a floor of {_percent(float(floor.threshold))}"
    if floor.horizon_years == 1:
        return amount
    return amount + (" a year" if floor.basis == "per_year" else " over the whole period")


def _percent(share: float) -> str:
    return f"{100 * share:.10g} %"


def _periods(horizon_years: float) -> str:
    """The horizon as a unit, in the plural."""
    for length, unit in HORIZONS.items():
        if abs(horizon_years / length - 1) < 1e-9:
            return unit
    months = 12 * horizon_years
    if horizon_years < 2 and abs(months - round(months)) < 1e-9:
        return f"{round(months)}-month periods"
    return f"{horizon_years:.10g}-year periods"
