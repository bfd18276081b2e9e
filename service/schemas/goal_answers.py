"""Figures of plans: their shape in answers, and the values in that shape."""

from typing import Any

import numpy as np

from service.core.goals.outlook import Caution as Said
from service.core.goals.outlook import Outlook
from service.schemas.answers import Caution, Listed, Plain
from service.schemas.cautions import sentence
from service.schemas.shapes import COUNT, ONE, Each, Figure, Fixed, Group, Shape
from service.schemas.shortfall import BOUNDS

NUMBERS = {"type": "array", "items": ONE}
SENSITIVITIES = ("expected_return", "volatility", "contributions", "horizon_years")


def frequency() -> Group:
    """Print one probability as so many of so many."""
    return Group({"count": Fixed(COUNT), "out_of": Fixed(COUNT), "bound": Fixed(BOUNDS)})


def target_figures() -> dict[str, Shape]:
    """Figures that belong to one target."""
    return {
        "success_probability": Figure("chance that every withdrawal is paid and the target reached"),
        "solvent_below_target_probability": Figure("chance that every withdrawal is paid and the target missed"),
        "expected_gap": Figure("what is missing to the target on average, outcomes above it counting as zero"),
        "mean_gap_if_missed": Figure("what is missing on average where the target is missed"),
    }


def outlook_shape() -> dict[str, Shape]:
    """Every figure of a plan."""
    target = target_figures()
    years = Group(
        {
            "year": Fixed(NUMBERS),
            "depletion_probability": Fixed(NUMBERS | {"description": "depleted before that year"}),
            "expected_wealth": Fixed(NUMBERS),
            "bands": Each(
                {"probability": Fixed(ONE), "wealth": Fixed(NUMBERS)}, "lower quantiles of wealth, year by year"
            ),
        },
        "at the years 0, 1, 2, ... and the horizon, before that year's flow",
    )
    return {
        "success_probability": target["success_probability"],
        "depletion_probability": Figure("chance that a withdrawal cannot be paid in full, or that all is lost"),
        "solvent_below_target_probability": target["solvent_below_target_probability"],
        "frequencies": Group({"success_probability": frequency(), "depletion_probability": frequency()}),
        "expected_gap": target["expected_gap"],
        "mean_gap_if_missed": target["mean_gap_if_missed"],
        "expected_wealth": Figure("at the horizon"),
        "by_year": years,
        "money_lasts": Each({"probability": Fixed(ONE), "years": Figure("depleted by then with this probability")}),
        "lifetime_depletion_probability": Figure("chance to be depleted while somebody is alive, until the horizon"),
        "alive_at_horizon": Figure("chance that somebody is alive at the horizon"),
        "by_target": Each({"target": Fixed(ONE)} | target),
        "sensitivities": Group(
            {name: Figure("change of success_probability") for name in SENSITIVITIES},
            "for a return and a volatility 0.01 higher a year, contributions times 1.1, a horizon a year longer",
            nullable=True,
        ),
        "outcomes": Fixed(
            NUMBERS | {"description": "wealth at the horizon from worst to best; only where asked for"}, optional=True
        ),
    }


def outlook_values(found: Outlook) -> dict[str, Any]:
    """Put the figures under the names of the contract."""
    years, targets = found.by_year, found.by_target
    values: dict[str, Any] = {
        "success_probability": found.success_probability,
        "depletion_probability": found.depletion_probability,
        "solvent_below_target_probability": found.solvent_below_target_probability,
        "frequencies": {
            name: {"count": often.count, "out_of": often.out_of, "bound": often.bound}
            for name, often in found.frequencies.items()
        },
        "expected_gap": found.expected_gap,
        "mean_gap_if_missed": found.mean_gap_if_missed,
        "expected_wealth": found.expected_wealth,
        "by_year": {
            "year": Listed(years.year),
            "depletion_probability": Listed(years.depletion_probability),
            "expected_wealth": Listed(years.expected_wealth),
            "bands": [{"probability": Plain(band.probability), "wealth": Listed(band.wealth)} for band in years.bands],
        },
        "money_lasts": [{"probability": Plain(each.probability), "years": each.years} for each in found.money_lasts],
        "lifetime_depletion_probability": found.lifetime_depletion_probability,
        "alive_at_horizon": found.alive_at_horizon,
        "by_target": [each._asdict() for each in targets],
        "sensitivities": None if found.sensitivities is None else found.sensitivities._asdict(),
    }
    if found.outcomes is not None:
        values["outcomes"] = Listed(np.asarray(found.outcomes))
    return values


def outlook_reasons(found: Outlook, at: str = "") -> dict[str, str]:
    """Give why figures that are null are so, by pointer."""
    reasons = {f"{at}/money_lasts/{index}/years": "beyond_horizon" for index in range(len(found.money_lasts))}
    reasons |= {f"{at}/lifetime_depletion_probability": "needs_lifetime", f"{at}/alive_at_horizon": "needs_lifetime"}
    return reasons | {f"{at}/sensitivities": "not_computed"}


def goal_cautions(*said: Said) -> tuple[Caution, ...]:
    """Give the sentences that belong beside the figures of a plan."""
    return (sentence("model_not_forecast"), *(sentence(each.code, None, **each.params) for each in said))
