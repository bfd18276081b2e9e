"""Making returns and laws for tests, by name and plain numbers."""

from typing import Any

import numpy as np

from service.core.arrays import Numbers, number
from service.core.returns import RETURN_MODELS, HorizonLaw, Returns, law_of_horizon


def returns(
    model: str,
    *,
    period: str = "year",
    periods_per_year: float | None = None,
    compounding: str = "simple",
    sample_size: Any = None,
    **parameters: Any,
) -> Returns:
    """Returns as a client would describe them; lists become arrays."""
    kind = RETURN_MODELS[model]
    declared = kind.parameterisations[0].parameters
    values = {name: declared[name].as_numbers(value) for name, value in parameters.items()}
    size = None if sample_size is None else as_numbers(sample_size)
    return Returns(kind(**values), period, periods_per_year, compounding, size)


def law(model: str, *, horizon_years: float = 1, uncertainty: str = "ignored", **given: Any) -> HorizonLaw:
    """The law of the horizon of such returns."""
    return law_of_horizon(returns(model, **given), horizon_years, uncertainty)


def as_numbers(value: Any) -> Numbers:
    """A number as float64, a list as an array."""
    return np.array(value, np.float64)[()] if isinstance(value, list) else number(value)
