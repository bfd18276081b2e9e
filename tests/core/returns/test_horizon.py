"""Which horizons a model answers, and what it says about the others."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit, Refusal
from service.core.returns import Returns, law_of_horizon
from service.core.returns.horizon import placed
from tests.core.returns.build import law, returns

LOGNORMAL: dict[str, Any] = {"model": "lognormal", "expected_return": 0.05, "volatility": 0.1}
NORMAL: dict[str, Any] = {"model": "normal", "expected_return": 0.05, "volatility": 0.1}
OBSERVED: dict[str, Any] = {"model": "empirical", "observations": [0.1, 0.2]}
STUDENT: dict[str, Any] = {"model": "student_t", "expected_return": 0.05, "volatility": 0.1, "degrees_of_freedom": 4}


def refusal(**given: Any) -> Refusal:
    with pytest.raises(DoesNotFit) as raised:
        law(**given)
    (one,) = raised.value.refusals
    return one


@pytest.mark.parametrize(
    ("period", "years"), [("year", 1), ("quarter", 0.25), ("month", 1 / 12), ("week", 1 / 52), ("day", 1 / 252)]
)
@pytest.mark.parametrize("given", [NORMAL, OBSERVED, STUDENT, LOGNORMAL])
def test_every_model_answers_one_period(given: dict[str, Any], period: str, years: float) -> None:
    found = law(**given, period=period, horizon_years=years)
    assert float(found.mean()) == pytest.approx(0.15 if given is OBSERVED else 0.05)


@pytest.mark.parametrize("years", [0.5, 1.5, 1e-12])
@pytest.mark.parametrize("given", [NORMAL, OBSERVED, STUDENT])
def test_part_of_a_period_is_refused_with_what_to_send_instead(given: dict[str, Any], years: float) -> None:
    found = refusal(**given, horizon_years=years)
    assert (found.path, found.code) == (("horizon_years",), "horizon_not_divisible")
    assert "lognormal, or normal with continuous compounding" in found.detail


def test_a_horizon_within_rounding_of_whole_periods_is_whole() -> None:
    monthly = returns(**NORMAL, period="month")
    assert monthly.periods(1 / 12 + 1e-12) == 1
    assert monthly.periods(0.1) == pytest.approx(1.2)


@pytest.mark.parametrize("years", [1 / 12, 0.3, 1, 2.5, 40])
def test_the_lognormal_law_and_continuous_normal_returns_divide(years: float) -> None:
    assert law(**LOGNORMAL, horizon_years=years).log_growth().standard_deviation > 0
    found = law(**NORMAL, compounding="continuous", horizon_years=years)
    assert float(found.log_growth().mean) == pytest.approx(0.05 * years)


@pytest.mark.parametrize(
    "given",
    [
        {**STUDENT, "sample_size": 20},
        {**OBSERVED, "sample_size": 20},
        {**NORMAL, "sample_size": 20, "horizon_years": 2},
        {**STUDENT, "sample_size": 20, "compounding": "continuous"},
    ],
)
def test_predictive_laws_of_other_models_are_refused(given: dict[str, Any]) -> None:
    found = refusal(**given, uncertainty="predictive")
    assert (found.path, found.code) == (("parameter_uncertainty",), "predictive_not_available")


def test_a_predictive_law_needs_a_sample_size_of_four() -> None:
    missing = refusal(**NORMAL, uncertainty="predictive")
    assert (missing.path, missing.code) == (("returns", "sample_size"), "required")
    small = refusal(**NORMAL, uncertainty="predictive", sample_size=3)
    assert (small.path, small.code) == (("returns", "sample_size"), "must_be_at_least")
    assert np.isfinite(law(**NORMAL, uncertainty="predictive", sample_size=4).standard_deviation())


def test_a_sample_size_may_be_a_plain_whole_number() -> None:
    plain = Returns(returns(**NORMAL).model, sample_size=10)
    found = law_of_horizon(plain, 1, "predictive").probability_below(number(-0.2))
    assert found == law(**NORMAL, uncertainty="predictive", sample_size=10).probability_below(number(-0.2))


def test_a_refusal_about_the_returns_is_led_to_where_they_stand() -> None:
    about_returns = Refusal(("returns", "sample_size"), "required", "", {})
    assert placed(about_returns, ("portfolios", 3, "returns")).path == ("portfolios", 3, "returns", "sample_size")
    about_question = Refusal(("horizon_years",), "horizon_not_divisible", "", {})
    assert placed(about_question, ("portfolios", 3, "returns")) is about_question


def test_probabilities_are_those_of_the_whole_horizon() -> None:
    yearly = law(**LOGNORMAL, horizon_years=10)
    monthly_growth = law(
        **(NORMAL | {"expected_return": 0.004, "volatility": 0.03}),
        compounding="continuous",
        period="month",
        horizon_years=10,
    )
    assert float(monthly_growth.log_growth().mean) == pytest.approx(0.48)
    assert 0 < yearly.probability_below(number(0.2)) < 0.5
