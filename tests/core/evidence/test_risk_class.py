"""Risk classes against the printed formulas and classes of the two standards."""

import numpy as np
import pytest

from service.core.errors import DoesNotFit
from service.core.evidence.risk_class import BOUNDS, CESR, EU, equivalent_volatility, risk_class, value_at_risk
from service.core.evidence.series import SampleMoments, log_returns, sample_moments


def test_the_formula_of_the_regulation_by_hand() -> None:
    # Delegated Regulation (EU) 2017/653, Annex II part 1, points 12 and 13, for invented moments; computed by hand
    moments = SampleMoments(0.00021, 0.0098, -0.38, 2.6)
    at_risk = value_at_risk(moments, 1280)
    assert at_risk == pytest.approx(-0.750480227825, rel=1e-11)
    assert equivalent_volatility(at_risk, 5) == pytest.approx(0.157188633649, rel=1e-11)


def test_the_printed_constants_are_those_of_their_score() -> None:
    # points 12 and 13 print four figures that follow from z = -1.96, rounded to three digits
    z = -1.96
    assert round((z * z - 1) / 6, 3) == 0.474
    assert round((z**3 - 3 * z) / 24, 4) == -0.0687
    assert round(-(2 * z**3 - 5 * z) / 36, 3) == 0.146
    assert round(z * z, 3) == 3.842


def series(spread: float, count: int, seed: int = 1) -> "np.ndarray[tuple[int], np.dtype[np.float64]]":
    return np.random.default_rng(seed).normal(0.0, spread, count)


@pytest.mark.parametrize(
    ("spread", "expected"), [(1e-4, 1), (0.001, 2), (0.005, 3), (0.009, 4), (0.015, 5), (0.03, 6), (0.08, 7)]
)
def test_every_class_is_reached(spread: float, expected: int) -> None:
    found = risk_class(series(spread, 1280), EU, 256, 5, "day")
    assert found.market_risk_class == expected
    # under normal returns the equivalent volatility is about that of the year, above it for the loss of half a variance
    assert found.var_equivalent_volatility == pytest.approx(spread * 16, rel=0.2)
    assert found.class_lower_bound <= found.var_equivalent_volatility < found.class_upper_bound
    assert found.distance_to_lower + found.distance_to_upper == pytest.approx(
        found.class_upper_bound - found.class_lower_bound
    )
    assert found.cautions == ()


def test_bounds_belong_to_the_class_above() -> None:
    # CESR 10-673: intervals closed below
    for place, bound in enumerate(BOUNDS[CESR]):
        returns = np.log1p(np.array([1.0, -1.0] * 30) * bound / np.sqrt(12) * np.sqrt(59 / 60))
        found = risk_class(returns, CESR, 12, 5, "month")
        assert found.annualised_volatility == pytest.approx(bound, rel=1e-12)
        nudged = risk_class(returns * 1.001, CESR, 12, 5, "month")
        assert nudged.market_risk_class == place + 2


def test_volatility_of_cesr_is_that_of_simple_returns() -> None:
    returns = series(0.02, 260)
    found = risk_class(returns, CESR, 52, 5, "week")
    assert found.annualised_volatility == pytest.approx(np.sqrt(52) * np.std(np.expm1(returns), ddof=1))
    assert np.isnan(found.value_at_risk_return_space)
    assert np.isnan(found.var_equivalent_volatility)
    assert found.cautions == ()


def test_moments_are_those_of_the_log_returns() -> None:
    returns = series(0.02, 100) ** 3
    found = sample_moments(returns)
    centred = (returns - returns.mean()) / returns.std()
    assert found.mean == pytest.approx(returns.mean())
    assert found.standard_deviation == pytest.approx(returns.std())
    assert found.skewness == pytest.approx(np.mean(centred**3))
    assert found.excess_kurtosis == pytest.approx(np.mean(centred**4) - 3)


def test_a_constant_series_has_no_shape_and_the_lowest_class() -> None:
    found = risk_class(np.full(600, 0.0001), EU, 256, 5, "day")
    assert found.moments.standard_deviation == 0
    assert np.isnan(found.moments.skewness)
    assert found.market_risk_class == 1


def test_a_short_history_is_said() -> None:
    assert risk_class(series(0.01, 300), EU, 256, 5, "day").cautions == ("short_history",)


def test_moments_beyond_the_formula_are_said() -> None:
    # one jump upwards among small moves: skewness of 15 makes the value at risk a large gain
    returns = np.full(500, 1e-4)
    returns[7] = 0.5
    found = risk_class(returns, EU, 256, 0.02, "day")
    assert "formula_outside_its_range" in found.cautions
    assert found.market_risk_class == 1
    assert np.isnan(equivalent_volatility(2.0, 1))


def test_prices_become_log_returns() -> None:
    assert log_returns(None, np.array([1.0, 2.0, 1.0])) == pytest.approx([np.log(2), -np.log(2)])
    assert log_returns(np.array([1.0, -0.5]), None) == pytest.approx([np.log(2), -np.log(2)])


@pytest.mark.parametrize(
    ("returns", "prices", "path", "code"),
    [
        ([0.1, -1.0], None, ("observed_returns", 1), "must_be_above"),
        (None, [1.0, 0.0, 2.0], ("observed_prices", 1), "must_be_positive"),
        ([0.1], None, ("observed_returns",), "too_few"),
        (None, [1.0, 2.0], ("observed_prices",), "too_few"),
    ],
)
def test_series_that_do_not_fit(
    returns: list[float] | None, prices: list[float] | None, path: tuple[str | int, ...], code: str
) -> None:
    with pytest.raises(DoesNotFit) as raised:
        log_returns(*(None if values is None else np.array(values) for values in (returns, prices)))
    assert [(refusal.path, refusal.code) for refusal in raised.value.refusals] == [(path, code)]
