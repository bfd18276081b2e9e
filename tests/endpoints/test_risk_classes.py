"""POST /v1/risk-classes."""

from typing import Any

import numpy as np
import pytest

from tests.conftest import Asker

PATH = "/v1/risk-classes"
RETURNS = np.random.default_rng(3).normal(0.0003, 0.01, 1280).tolist()
QUESTION: dict[str, Any] = {
    "observed_returns": RETURNS,
    "period": "day",
    "holding_period_years": 5,
    "standard": "eu_2017_653",
}


def test_a_class_with_every_figure_on_the_way(ask: Asker) -> None:
    answer = ask.answer(PATH, QUESTION)
    assert answer["market_risk_class"] == 4
    assert (answer["class_lower_bound"], answer["class_upper_bound"]) == (0.12, 0.2)
    assert answer["observations"] == 1280
    assert answer["periods_in_holding_period"] == 1280
    assert answer["annualised_volatility"] is None
    assert answer["null_reasons"] == [{"pointer": "/annualised_volatility", "reason": "other_standard"}]
    codes = [caution["code"] for caution in answer["cautions"]]
    assert codes == ["model_not_forecast", "class_is_not_a_limit", "as_understood_here"]


def test_prices_and_returns_of_one_series_say_the_same(ask: Asker) -> None:
    prices = (100 * np.cumprod([1, *(1 + np.array(RETURNS))])).tolist()
    by_prices = ask.answer(
        PATH, {n: v for n, v in QUESTION.items() if n != "observed_returns"} | {"observed_prices": prices}
    )
    by_returns = ask.answer(PATH, QUESTION)
    assert by_prices["var_equivalent_volatility"] == pytest.approx(by_returns["var_equivalent_volatility"], rel=1e-9)


def test_the_other_standard_and_a_short_history(ask: Asker) -> None:
    question = QUESTION | {"observed_returns": RETURNS[:100], "period": "week", "standard": "cesr_10_673"}
    answer = ask.answer(PATH, question)
    assert answer["var_equivalent_volatility"] is None
    assert answer["annualised_volatility"] == pytest.approx(np.sqrt(52) * np.std(RETURNS[:100], ddof=1))
    short = next(caution for caution in answer["cautions"] if caution["code"] == "short_history")
    assert (short["pointer"], short["params"]) == ("/observed_returns", {"observations": 100})


def test_the_highest_class_has_no_upper_bound(ask: Asker) -> None:
    wild = (np.array(RETURNS) * 10).clip(-0.9, 2).tolist()
    answer = ask.answer(PATH, QUESTION | {"observed_returns": wild})
    assert (answer["market_risk_class"], answer["class_upper_bound"]) == (7, None)
    assert {"pointer": "/class_upper_bound", "reason": "positive_infinity"} in answer["null_reasons"]


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({}, {"/period": "required", "/holding_period_years": "required", "/standard": "required"}),
        ({n: v for n, v in QUESTION.items() if n != "observed_returns"}, {"": "required"}),
        (QUESTION | {"observed_prices": [1, 2, 3]}, {"/observed_prices": "does_not_go_together"}),
        (QUESTION | {"standard": "cesr_10_673"}, {"/period": "unknown_choice"}),
        (QUESTION | {"observed_returns": [0.1, -1, 0.2]}, {"/observed_returns/1": "must_be_above"}),
        (QUESTION | {"observed_returns": [0.1, None]}, {"/observed_returns/1": "not_a_number"}),
        (QUESTION | {"observed_returns": 0.1}, {"/observed_returns": "not_an_array"}),
        (QUESTION | {"holding_period_years": 0}, {"/holding_period_years": "must_be_positive"}),
    ],
)
def test_what_does_not_fit(ask: Asker, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(PATH, question) == expected
