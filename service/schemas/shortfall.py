"""Figures of portfolios against a floor: their shape in answers, and the values in that shape."""

from typing import Any

import numpy as np

from service.core.portfolio.shortfall import Shortfall
from service.schemas.answers import Plain
from service.schemas.shapes import COUNT, MANY, ONE, Each, Figure, Fixed, Group, Shape

ONE_OR_LIST = {"oneOf": [COUNT, {"type": "array", "items": COUNT}]}
BOUNDS = {"type": "string", "enum": ["about", "at_most", "at_least", "exactly"]}


def frequency_shape(many: bool) -> Fixed:
    """Print "so many of so many"."""
    count = {"type": "array", "items": COUNT} if many else COUNT
    bound = {"type": "array", "items": BOUNDS} if many else BOUNDS
    out_of = ONE_OR_LIST | {"description": "one number where all share it"} if many else COUNT
    one = {
        "type": "object",
        "properties": {"count": count, "out_of": out_of, "bound": bound},
        "required": ["count", "out_of", "bound"],
    }
    return Fixed(
        {
            "type": "object",
            "properties": {"shortfall_probability": one},
            "required": ["shortfall_probability"],
            "description": "the probability as so many of so many, for a client's eyes",
        }
    )


def shortfall_shape(many: bool) -> dict[str, Shape]:
    """Every figure of one portfolio (or, `many`, of a list)."""
    loss: dict[str, Shape] = {
        "confidence_level": Fixed({"type": "number", "format": "double"}),
        "value_at_risk": Figure("loss that is exceeded with one minus the level; a gain is negative"),
        "expected_shortfall": Figure("mean loss in the worst share of outcomes of one minus the level"),
    }
    return {
        "shortfall_probability": Figure("chance that the return stays below the floor; equal to it is acceptable"),
        "frequencies": frequency_shape(many),
        "safety_first_ratio": Figure("(expected return - floor) / volatility, over the horizon"),
        "log_safety_first_ratio": Figure("the same of the logarithm of growth; null where a total loss is possible"),
        "distribution_free_bound": Figure(
            "the chance of missing the floor is at most this for any law with this mean and volatility"
        ),
        "expected_return": Figure("expected simple return over the horizon"),
        "volatility": Figure("its standard deviation"),
        "expected_gap": Figure("by how much the floor is missed on average, outcomes above it counting as zero"),
        "mean_return_in_shortfall": Figure("mean return of the outcomes below the floor"),
        "mean_gap_in_shortfall": Figure("by how much those outcomes miss the floor on average"),
        "lower_partial_moments": Group({f"order_{j}": Figure(f"E[max(floor - return, 0)^{j}]") for j in range(3)}),
        "threshold_at_probability": Group(
            {
                "probability": Fixed({"type": "number", "format": "double"}),
                "threshold": Figure("the return that is missed with this probability, over the horizon"),
                "threshold_per_year": Figure("the same per year"),
            }
        ),
        "tail_losses": Each(loss, "losses positive, as a share of the value at the start"),
        "total_loss_probability": Figure("chance that nothing is left"),
        "actual_moments": Group(
            {
                "mean": Figure("of the modelled return of one period"),
                "standard_deviation": Figure("of the same"),
                "skewness": Figure("of the same"),
                "excess_kurtosis": Figure("of the same"),
            }
        ),
    }


def outcomes_shape(many: bool) -> dict[str, Shape]:
    """Print the outcomes that `equally_likely_outcomes` adds."""
    words = "returns from worst to best, each standing for one of so many equally likely ones; only where asked for"
    return {"outcomes": Fixed({"type": "array", "items": MANY if many else ONE, "description": words}, optional=True)}


def shortfall_values(found: Shortfall) -> dict[str, Any]:
    """Put the figures under the names of the contract; what is the same for every floor or portfolio is Plain."""
    values: dict[str, Any] = {name: getattr(found, name) for name in shortfall_shape(many=False)}
    often = found.frequencies
    values["frequencies"] = {
        "shortfall_probability": {"count": often.count, "out_of": common(often.out_of), "bound": often.bound}
    }
    values["lower_partial_moments"] = found.lower_partial_moments._asdict()
    at = found.threshold_at_probability
    values["threshold_at_probability"] = at._asdict() | {"probability": Plain(at.probability)}
    values["tail_losses"] = [
        loss._asdict() | {"confidence_level": Plain(loss.confidence_level)} for loss in found.tail_losses
    ]
    values["actual_moments"] = found.actual_moments._asdict()
    if found.outcomes is not None:
        values["outcomes"] = list(found.outcomes)
    return values


def common(counts: Any) -> Any:
    """Give one number in place of an array whose entries are all the same."""
    return int(counts.flat[0]) if counts.size and (counts == counts.flat[0]).all() else counts


def rows_of(values: Any, count: int) -> list[Any]:
    """Turn figures that are arrays over portfolios into one tree of plain values for each portfolio."""
    if isinstance(values, dict):
        columns = {name: rows_of(inner, count) for name, inner in values.items()}
        return [{name: column[i] for name, column in columns.items()} for i in range(count)]
    if isinstance(values, list):
        parts = [rows_of(inner, count) for inner in values]
        return [[part[i] for part in parts] for i in range(count)]
    if isinstance(values, Plain):
        return [values] * count
    spread: list[Any] = np.broadcast_to(values, (count,)).tolist()
    return spread
