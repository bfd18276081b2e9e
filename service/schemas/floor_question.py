"""What shortfalls and rankings ask alike: the floor, the horizon, the levels."""

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from service.core.parameters import Parameter
from service.core.portfolio.floor import Floor
from service.core.returns import Returns
from service.schemas.answers import Caution
from service.schemas.fields import ChoiceField, LevelsField, NumberField
from service.schemas.question import Asked, Question
from service.schemas.slips import spread_in_percent, threshold_in_percent, unusual_levels

DEFAULT_LEVELS = (0.95, 0.99)
DEFAULT_QUANTILE_PROBABILITY = 0.05
MOST_LEVELS = 20


class FloorQuestion(Question):
    """Base of the questions about a floor; each adds the floor itself, a number or a list."""

    threshold_basis = ChoiceField(
        "per_year (the default): the threshold is a return per year; over_horizon: over the whole horizon",
        ("per_year", "over_horizon"),
    )
    horizon_years = NumberField(
        Parameter("length of the horizon in years (default 1)", above=0, at_most=200, example=1), arrays=False
    )
    confidence_levels = LevelsField(
        Parameter("levels of the tail losses (default 0.95 and 0.99)", above=0, below=1, example=0.95), MOST_LEVELS
    )
    quantile_probability = NumberField(
        Parameter("probability of threshold_at_probability (default 0.05)", above=0, below=1, example=0.05),
        arrays=False,
    )
    parameter_uncertainty = ChoiceField(
        "ignored (the default): estimates are taken as true; predictive: their sampling error widens the law",
        ("ignored", "predictive"),
    )
    equally_likely_outcomes = NumberField(
        Parameter("adds so many outcomes from worst to best", at_least=2, at_most=1000, whole=True, example=10),
        arrays=False,
    )


def floor_of(asked: Asked) -> Floor:
    """Make the floor. Raises DoesNotFit."""
    return Floor(
        asked["threshold"],
        asked.get("threshold_basis", "per_year"),
        asked.get("horizon_years", 1.0),
    )


def settings_of(asked: Asked) -> dict[str, Any]:
    """Give the other settings as the core names them."""
    outcomes = asked.get("equally_likely_outcomes")
    return {
        "confidence_levels": asked.get("confidence_levels", DEFAULT_LEVELS),
        "quantile_probability": asked.get("quantile_probability", DEFAULT_QUANTILE_PROBABILITY),
        "outcomes_count": None if outcomes is None else int(outcomes),
        "parameter_uncertainty": asked.get("parameter_uncertainty", "ignored"),
    }


OF_A_FORMULA, OF_AN_INVERSION = 0.5, 6_000.0
"""Microseconds for one law: by a formula over arrays, or compounded over several periods for itself."""


def work_of(laws: Iterable[Returns], horizon_years: float) -> float:
    """Count the microseconds that laws of the horizon ask for; equal laws are computed once."""
    work, compounded = 0.0, set()
    for returns in laws:
        values = vars(returns.model)
        count = int(np.broadcast(*values.values()).size) if returns.model.stacks else 1
        if returns.compounding in returns.model.divides or returns.periods(horizon_years) == 1:
            work += count * OF_A_FORMULA
        elif count > 1:
            work += count * OF_AN_INVERSION
        else:
            compounded.add((returns.model.name, returns.period, *(value.tobytes() for value in values.values())))
    return work + len(compounded) * OF_AN_INVERSION


def slips_in(asked: Asked, models: Mapping[str, Any]) -> list[Caution]:
    """Find figures that look like a slip: in per cent, or of the other tail. `models` by pointer."""
    settings = settings_of(asked)
    found = threshold_in_percent(asked["threshold"])
    found += unusual_levels(settings["confidence_levels"], settings["quantile_probability"])
    for pointer, model in models.items():
        found += spread_in_percent(vars(model), "expected_return", "volatility", pointer)
    return found
