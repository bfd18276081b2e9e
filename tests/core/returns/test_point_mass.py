"""Volatility 0 is a certainty, in every law alike."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from tests.core.returns.build import law

CERTAIN: dict[str, dict[str, Any]] = {
    "normal": {"model": "normal"},
    "normal continuous": {"model": "normal", "compounding": "continuous"},
    "lognormal": {"model": "lognormal"},
    "student_t": {"model": "student_t", "degrees_of_freedom": 4},
    "student_t continuous": {"model": "student_t", "compounding": "continuous", "degrees_of_freedom": 4},
}


@pytest.mark.parametrize("given", CERTAIN.values(), ids=CERTAIN.keys())
def test_everything_about_a_certain_return(given: dict[str, Any]) -> None:
    point = float(np.expm1(0.03)) if given.get("compounding") else 0.03
    found = law(**given, expected_return=0.03, volatility=0)
    thresholds = np.array([-0.5, point, 0.05])
    assert found.probability_below(thresholds).tolist() == [0, 0, 1]
    assert found.probability_at_most(thresholds).tolist() == [0, 1, 1]
    assert found.certain(thresholds).tolist() == [True, True, True]
    gaps = found.gaps(thresholds)
    assert gaps.order_1.tolist() == pytest.approx([0, 0, 0.05 - point], abs=1e-16)
    assert gaps.order_2.tolist() == pytest.approx([0, 0, (0.05 - point) ** 2], abs=1e-18)
    assert float(found.mean()) == pytest.approx(point, rel=1e-15)
    assert found.standard_deviation() == 0
    for probability in (0.01, 0.5, 0.99):
        assert float(found.quantile(number(probability))) == pytest.approx(point, rel=1e-15)
        assert float(found.expected_shortfall(number(probability))) == pytest.approx(-point, rel=1e-13)
    growth = found.log_growth()
    assert float(growth.mean) == pytest.approx(np.log1p(point), rel=1e-15)
    assert growth.standard_deviation == 0
    assert found.total_loss_probability() == 0


@pytest.mark.parametrize("model", ["normal", "student_t"])
def test_a_certain_total_loss_has_no_log_growth(model: str) -> None:
    extra: dict[str, Any] = {"degrees_of_freedom": 4} if model == "student_t" else {}
    found = law(model, expected_return=-1, volatility=0, **extra)
    assert found.total_loss_probability() == 1
    assert np.isnan(found.log_growth().mean)


@pytest.mark.parametrize("given", CERTAIN.values(), ids=CERTAIN.keys())
def test_certain_and_uncertain_portfolios_side_by_side(given: dict[str, Any]) -> None:
    found = law(**given, expected_return=[0.03, 0.03], volatility=[0, 0.1])
    below = found.probability_below(number(0.01))
    assert below[0] == 0
    assert 0 < below[1] < 1
    assert found.certain(number(0.01)).tolist() == [True, False]
    assert found.gaps(number(0.01)).order_1[0] == 0
