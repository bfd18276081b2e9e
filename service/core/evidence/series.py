"""Observed series: prices or simple returns, oldest first, as returns of one period."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import NO_VALUE, Numbers
from service.core.errors import DoesNotFit, Refusal
from service.core.parameters import Limit


@dataclass(frozen=True, slots=True)
class SampleMoments:
    """Mean, standard deviation, skewness and excess kurtosis of n values, all with divisor n; nan without spread."""

    mean: float
    standard_deviation: float
    skewness: float
    excess_kurtosis: float


def log_returns(observed_returns: Numbers | None, observed_prices: Numbers | None) -> Numbers:
    """Give log returns of simple returns (n above -1), or of prices (n + 1 above 0). Raises DoesNotFit."""
    if observed_prices is not None:
        _refuse("observed_prices", observed_prices, Limit("above", 0))
        _refuse_few("observed_prices", observed_prices, 3)
        return np.diff(np.log(observed_prices))
    assert observed_returns is not None  # noqa: S101 - a question has one of the two
    _refuse("observed_returns", observed_returns, Limit("above", -1))
    _refuse_few("observed_returns", observed_returns, 2)
    return np.log1p(observed_returns)


def _refuse(name: str, values: Numbers, limit: Limit) -> None:
    found = limit.refusal(name, values)
    if found is not None:
        raise DoesNotFit([found])


def _refuse_few(name: str, values: Numbers, least: int) -> None:
    if values.size < least:
        words = f"{name} needs {least} entries or more."
        raise DoesNotFit([Refusal((name,), "too_few", words, {"at_least": least, "given": int(values.size)})])


def sample_moments(values: Numbers) -> SampleMoments:
    """Describe the values as they are; offsets from a rough mean keep the digits of a small spread."""
    rough = values.mean()
    offsets = values - rough
    mean = rough + offsets.mean()
    offsets = offsets - offsets.mean()
    spread = float(np.sqrt(np.mean(offsets * offsets)))
    if spread <= 1e-15 * (1 + abs(float(mean))):
        return SampleMoments(float(mean), 0.0, float(NO_VALUE), float(NO_VALUE))
    scores = offsets / spread
    return SampleMoments(float(mean), spread, float(np.mean(scores**3)), float(np.mean(scores**4)) - 3)
