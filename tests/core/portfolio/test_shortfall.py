"""Shortfall figures: laws that hold for every model, shapes, horizons and figures without a value."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtr

from service.core.errors import DoesNotFit
from service.core.portfolio import Floor, Shortfall, shortfall
from service.core.portfolio.floor import per_year
from service.core.returns import Returns
from tests.core.portfolio.build import figures, floor, normal
from tests.core.portfolio.strategies import any_returns
from tests.core.returns.build import as_numbers, returns

LEVELS = [0.5, 0.9, 0.95, 0.99]
THRESHOLDS = [round(t, 2) for t in np.arange(-0.9, 1.0, 0.05).tolist()]
LOGNORMAL: dict[str, Any] = {"model": "lognormal", "expected_return": 0.06, "volatility": 0.12}


def code(threshold: Any, **more: Any) -> tuple[tuple[str | int, ...], str]:
    with pytest.raises(DoesNotFit) as raised:
        floor(threshold, **more)
    (refusal,) = raised.value.refusals
    return refusal.path, refusal.code


@settings(max_examples=150, deadline=None)
@given(any_returns())
def test_laws_of_the_figures_at_rising_thresholds(of: Returns) -> None:
    found = figures(of, THRESHOLDS, confidence_levels=LEVELS)
    order_0, order_1, order_2 = found.lower_partial_moments
    assert (order_0 == found.shortfall_probability).all()
    assert (order_1 == found.expected_gap).all()
    assert ((order_0 >= 0) & (order_0 <= 1)).all()
    for rising in (order_0, order_1, order_2):
        assert (np.diff(rising) >= -1e-13).all()
    # the gap is convex in the threshold, its slope the probability
    assert (np.diff(order_1, 2) >= -1e-13).all()
    slopes = np.diff(order_1) / np.diff(THRESHOLDS)
    assert (slopes >= order_0[:-1] - 1e-11).all()
    assert (slopes <= order_0[1:] + 1e-11).all()
    assert (order_1**2 <= order_2 * order_0 + 1e-13).all()  # Cauchy and Schwarz
    for loss in found.tail_losses:
        known = ~np.isnan(loss.expected_shortfall)
        assert (loss.expected_shortfall[known] >= loss.value_at_risk[known] - 1e-12).all()
    at_risk = [float(loss.value_at_risk[0]) for loss in found.tail_losses]
    assert at_risk == sorted(at_risk)
    bounded = ~np.isnan(found.distribution_free_bound)
    assert (order_0[bounded] <= found.distribution_free_bound[bounded] + 1e-12).all()


@settings(max_examples=100, deadline=None)
@given(any_returns(), st.integers(1, 40))
def test_equally_likely_outcomes_stand_from_worst_to_best(of: Returns, count: int) -> None:
    outcomes = figures(of, outcomes_count=count).outcomes
    assert outcomes is not None
    assert outcomes.shape == (count,)
    assert (np.diff(outcomes) >= 0).all()


def test_outcomes_are_the_middles_of_equal_shares() -> None:
    found = figures(returns("empirical", observations=[-0.2, 0.0, 0.1, 0.4]), outcomes_count=4)
    assert found.outcomes is not None
    assert found.outcomes.tolist() == [-0.2, 0.0, 0.1, 0.4]
    assert figures(normal(0.05, 0.1)).outcomes is None


def test_the_gap_in_shortfall_is_the_average_of_what_missed_the_floor() -> None:
    found = figures(returns("empirical", observations=[-0.2, 0.0, 0.02, 0.4]))
    assert float(found.shortfall_probability) == 0.5
    assert float(found.mean_gap_in_shortfall) == pytest.approx(0.12)
    assert float(found.mean_return_in_shortfall) == pytest.approx(-0.1)
    assert float(found.expected_gap) == pytest.approx(0.06)


def test_averages_in_shortfall_have_no_value_where_the_probability_is_lost_in_the_error() -> None:
    for of in (normal(0.5, 0.01), returns("empirical", observations=[0.1])):
        found = figures(of)
        assert np.isnan(found.mean_gap_in_shortfall)
        assert np.isnan(found.mean_return_in_shortfall)


def test_thresholds_in_an_array_go_with_every_figure() -> None:
    found = figures(normal(0.05, 0.1), [0.0, 0.02, 0.04], confidence_levels=[0.95], outcomes_count=2)
    for name in ("shortfall_probability", "expected_return", "volatility", "safety_first_ratio", "expected_gap"):
        assert getattr(found, name).shape == (3,)
    assert found.tail_losses[0].value_at_risk.shape == (3,)
    assert found.actual_moments.mean.shape == (3,)
    assert found.threshold_at_probability.threshold.shape == (3,)
    assert found.outcomes is not None
    assert found.outcomes.shape == (2, 3)
    assert found.frequencies.count.shape == (3,)


def test_portfolios_and_thresholds_of_one_length_go_together() -> None:
    of = returns("student_t", expected_return=[0.04, 0.06], volatility=[0.1, 0.2], degrees_of_freedom=4)
    together = figures(of, [0.0, 0.05]).shortfall_probability
    alone = [
        float(
            figures(
                returns("student_t", expected_return=m, volatility=v, degrees_of_freedom=4), t
            ).shortfall_probability
        )
        for m, v, t in ((0.04, 0.1, 0.0), (0.06, 0.2, 0.05))
    ]
    assert together.tolist() == pytest.approx(alone, rel=1e-14)


def test_the_higher_ratio_can_miss_the_floor_more_often_over_thirty_years() -> None:
    """Lognormal 6/12 against 8/16, 2 % a year: ratio 1.00 against 0.86, chance 6.0 % against 4.3 %."""
    calm = figures(returns(**LOGNORMAL), horizon_years=30)
    bold = figures(returns(**LOGNORMAL | {"expected_return": 0.08, "volatility": 0.16}), horizon_years=30)
    assert [round(float(f.safety_first_ratio), 2) for f in (calm, bold)] == [1.0, 0.86]
    assert [round(float(f.shortfall_probability), 3) for f in (calm, bold)] == [0.06, 0.043]


@settings(max_examples=100, deadline=None)
@given(st.floats(0.001, 0.5), st.floats(-0.1, 0.2), st.floats(-0.2, 0.2), st.floats(0.05, 30))
def test_the_log_ratio_of_lognormal_growth_is_the_score_of_its_chance(
    deviation: float, mean: float, threshold: float, years: float
) -> None:
    found = figures(returns("lognormal", expected_return=mean, volatility=deviation), threshold, years)
    assert float(ndtr(-found.log_safety_first_ratio)) == pytest.approx(float(found.shortfall_probability), abs=1e-12)


def test_a_ratio_without_deviation_is_infinite_or_has_no_value() -> None:
    found = figures(normal(0.02, 0), [0.0, 0.02, 0.05])
    assert found.safety_first_ratio.tolist() == pytest.approx([np.inf, np.nan, -np.inf], nan_ok=True)
    assert found.log_safety_first_ratio.tolist() == pytest.approx([np.inf, np.nan, -np.inf], nan_ok=True)
    assert found.distribution_free_bound.tolist() == [0, 1, 1]
    assert found.frequencies.bound.tolist() == ["exactly"] * 3


def test_figures_of_a_law_without_finite_mean() -> None:
    of = returns("student_t", compounding="continuous", expected_return=0.05, volatility=0.1, degrees_of_freedom=4)
    found = figures(of, confidence_levels=[0.95])
    assert found.expected_return == np.inf
    assert found.volatility == np.inf
    for missing in (found.safety_first_ratio, found.distribution_free_bound, found.tail_losses[0].expected_shortfall):
        assert np.isnan(missing)
    assert 0.3 < found.log_safety_first_ratio < 0.4
    assert found.expected_gap > 0


def test_a_floor_at_or_below_a_total_loss() -> None:
    of = returns(**LOGNORMAL)
    at_loss = figures_over_horizon(of, -1.0)
    assert at_loss.shortfall_probability == 0
    assert at_loss.log_safety_first_ratio == np.inf
    assert np.isnan(figures_over_horizon(of, -1.5).log_safety_first_ratio)
    assert np.isnan(figures(normal(0.05, 0.1)).log_safety_first_ratio)


def figures_over_horizon(of: Returns, threshold: float) -> Shortfall:
    return shortfall(of, floor(threshold, basis="over_horizon"))


def test_a_floor_per_year_compounds_and_one_over_the_horizon_does_not() -> None:
    assert float(floor(0.02, 10).over_horizon()) == pytest.approx(1.02**10 - 1, rel=1e-15)
    assert float(floor(0.02, 10, "over_horizon").over_horizon()) == 0.02
    assert float(floor(0.02).over_horizon()) == 0.02


def test_floors_that_do_not_fit() -> None:
    assert code(-1) == (("threshold",), "must_be_above")
    assert code([0.0, -1.0, -2.0]) == (("threshold", 1), "must_be_above")
    assert code(0.02, horizon_years=0.0) == (("horizon_years",), "must_be_positive")
    assert Floor(as_numbers(-3), "over_horizon").over_horizon() == -3


def test_a_return_over_the_horizon_per_year() -> None:
    over = np.array([-1.5, -1.0, 0.21])
    with np.errstate(divide="ignore"):
        yearly = per_year(over, 2).tolist()
    assert yearly == pytest.approx([np.nan, -1, 0.1], nan_ok=True)
    assert per_year(over, 1).tolist() == [-1.5, -1, 0.21]
    found = figures(returns(**LOGNORMAL), horizon_years=10).threshold_at_probability
    assert float((1 + found.threshold_per_year) ** 10) == pytest.approx(float(1 + found.threshold))


def test_refusals_say_where_the_returns_stand() -> None:
    with pytest.raises(DoesNotFit) as raised:
        figures(normal(0.05, 0.1), parameter_uncertainty="predictive")
    assert raised.value.refusals[0].path == ("portfolio", "returns", "sample_size")
    with pytest.raises(DoesNotFit) as raised:
        figures(normal(0.05, 0.1), horizon_years=2.5)
    assert raised.value.refusals[0].path == ("horizon_years",)


def test_uncertain_estimates_make_a_shortfall_more_likely() -> None:
    of = normal(0.06, 0.1, sample_size=10)
    assert figures(of, -0.2, parameter_uncertainty="predictive").shortfall_probability > (
        3 * figures(of, -0.2).shortfall_probability
    )
