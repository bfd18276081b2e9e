"""Making plans for tests from plain numbers."""

from collections.abc import Iterable
from typing import Any

import numpy as np

from service.core.arrays import Numbers, number
from service.core.goals import CashFlow, Leg, Plan
from service.core.returns import RETURN_MODELS, Returns


def returns(model: str = "lognormal", *, compounding: str = "simple", **given: Any) -> Returns:
    """Returns of one period: parameters as numbers or nested lists."""
    own = {k: given.pop(k) for k in ("period", "periods_per_year", "sample_size") if k in given}
    values = {k: np.array(v, np.float64) if isinstance(v, list) else number(v) for k, v in given.items()}
    return Returns(RETURN_MODELS[model](**values), compounding=compounding, **own)


def log_normal(log_mean: float, log_deviation: float, **given: Any) -> Returns:
    """Normal log growth of one period."""
    return returns("normal", compounding="continuous", expected_return=log_mean, volatility=log_deviation, **given)


def plan(
    initial_value: float | None = 10_000.0,
    flows: Iterable[CashFlow] = (),
    horizon: float | None = 5.0,
    target: float | tuple[float, ...] = 0.0,
    growth: Returns | tuple[Leg, ...] | None = None,
    **given: Any,
) -> Plan:
    """A plan with returns of 5 % and 12 % unless told otherwise."""
    growth = growth or returns(expected_return=0.05, volatility=0.12)
    legs = growth if isinstance(growth, tuple) else (Leg(None, growth),)
    targets = target if isinstance(target, tuple) else (float(target),)
    return Plan(initial_value, tuple(flows), horizon, targets, legs, **given)


def at_steps(amounts: Iterable[float], steps_a_year: float) -> list[CashFlow]:
    """Single flows at step 0, 1, 2, ..."""
    return [CashFlow(float(c), "once", step / steps_a_year) for step, c in enumerate(amounts) if c != 0]


def segments(flows: dict[str, Any]) -> Numbers:
    """Amounts by step, from the segments of the data."""
    amounts = np.zeros(flows["n"])
    for segment in flows["segments"]:
        steps = np.arange(segment["start"], segment["stop"], segment.get("every", 1))
        amounts[steps] += segment["amount"] * (1 + segment.get("growth", 0)) ** steps
    return amounts
