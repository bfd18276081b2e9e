"""Figures of outlooks beyond the engine: targets, years, lives, fee, inflation, shocks, inexact means, cautions."""

import dataclasses

import numpy as np
import pytest
from scipy.special import ndtr

from service.core.arrays import Numbers, number
from service.core.goals import CashFlow, GompertzLife, Leg, Lifetime, Plan, Shock, TableLife, outlook
from tests.core.goals.build import at_steps, log_normal, plan, returns
from tests.core.goals.exact import hermite_mean

GROWTH = log_normal(0.05, 0.2)
SPENDING = (CashFlow(-8, "year"),)


def success(asked: Plan) -> float:
    return outlook(asked).success_probability


def test_each_target_has_its_own_figures() -> None:
    several = outlook(plan(100, SPENDING, 10, (50.0, 0.0, 200.0), GROWTH))
    for row, target in zip(several.by_target, (50.0, 0.0, 200.0), strict=True):
        alone = outlook(plan(100, SPENDING, 10, target, GROWTH))
        assert row.target == target
        assert row.success_probability == pytest.approx(alone.success_probability, abs=1e-12)
        assert row.expected_gap == pytest.approx(alone.expected_gap, rel=1e-9, abs=1e-9)
    assert several.success_probability == several.by_target[0].success_probability
    assert several.by_target[1].expected_gap == 0
    assert several.by_target[1].success_probability == pytest.approx(1 - several.depletion_probability, abs=1e-15)
    missed = 1 - several.success_probability
    assert several.mean_gap_if_missed == pytest.approx(several.expected_gap / missed)


def test_a_target_of_nothing_without_withdrawals_is_always_reached() -> None:
    figures = outlook(plan(0, (), 3, 0, GROWTH))
    assert figures.success_probability == 1
    assert np.isnan(figures.mean_gap_if_missed)
    assert figures.depletion_probability == 0
    assert figures.expected_wealth == 0


def test_a_target_far_away_is_missed_by_what_is_expected() -> None:
    figures = outlook(plan(100, (), 3, 1e9, GROWTH))
    assert figures.success_probability == 0
    assert figures.expected_gap == pytest.approx(1e9 - 100 * np.exp(3 * 0.07), rel=1e-12)


def test_first_withdrawal_unmet_and_depletion_certain() -> None:
    at_once = outlook(plan(5, SPENDING, 3, 1, GROWTH))
    assert at_once.depletion_probability == 1
    assert at_once.by_year.depletion_probability.tolist() == [0, 1, 1, 1]
    assert [lasts.years for lasts in at_once.money_lasts] == [0] * 5
    assert at_once.by_year.bands[2].wealth.tolist() == [5, 0, 0, 0]
    assert at_once.by_year.expected_wealth.tolist() == [5, 0, 0, 0]
    later = outlook(plan(10, [CashFlow(-100, "once", 2)], 5, 1, GROWTH))
    assert later.depletion_probability == pytest.approx(1, abs=1e-12)
    assert later.expected_wealth == pytest.approx(0, abs=1e-9)
    gone = outlook(plan(10, [CashFlow(-1e9, "once", 2), CashFlow(50, "year", 3)], 5, 1, GROWTH))
    assert gone.success_probability == 0
    assert gone.by_year.bands[4].wealth[-1] == 0


def test_paying_the_last_cent_is_not_depletion() -> None:
    sure = log_normal(0.0, 0.0)
    exact = outlook(plan(30, [CashFlow(-10, "year")], 3, 0, sure))
    assert exact.depletion_probability == 0
    assert exact.success_probability == 1
    assert outlook(plan(30 * (1 - 1e-11), [CashFlow(-10, "year")], 3, 0, sure)).depletion_probability == 0
    assert outlook(plan(29.9, [CashFlow(-10, "year")], 3, 0, sure)).depletion_probability == 1
    # nothing left, and more comes before anything is due
    waits = outlook(plan(10, at_steps([-10, 0, 5, -3], 1), 4, 1, GROWTH))
    assert waits.depletion_probability == pytest.approx(ndtr((np.log(3 / 5) - 0.05) / 0.2), abs=1e-12)


def test_flows_that_begin_after_the_horizon_do_nothing() -> None:
    late = outlook(plan(100, [CashFlow(-50, "year", 10)], 5, 100, GROWTH))
    assert late.success_probability == success(plan(100, (), 5, 100, GROWTH))


def test_money_lasts_until_the_earliest_date_of_each_probability() -> None:
    figures = outlook(plan(100, [CashFlow(-10, "year")], 30, 0, GROWTH))
    cumulative = figures.by_year.depletion_probability
    for lasts in figures.money_lasts:
        if np.isnan(lasts.years):
            assert figures.depletion_probability < lasts.probability
        else:
            # by_year counts what happened before the year's flow
            assert cumulative[int(lasts.years)] < lasts.probability <= cumulative[int(lasts.years) + 1]


def test_inflation_and_fee_are_less_growth() -> None:
    real = outlook(plan(100, SPENDING, 10, 50, GROWTH, inflation_rate=0.02, yearly_fee=0.01))
    less = log_normal(0.05 + np.log(0.99 / 1.02), 0.2)
    plain = outlook(plan(100, SPENDING, 10, 50, less))
    assert real.success_probability == pytest.approx(plain.success_probability, abs=1e-12)
    assert real.expected_wealth == pytest.approx(plain.expected_wealth, rel=1e-12)
    assert "steady_inflation" in [caution.code for caution in real.cautions]
    assert "steady_inflation" not in [caution.code for caution in plain.cautions]


def test_a_shock_comes_after_the_flow_of_its_step() -> None:
    flows = [CashFlow(10, "year")]
    figures = outlook(plan(100, flows, 3, 1, GROWTH, shock=Shock(1, -0.5)))
    g = np.exp(0.07)
    assert figures.by_year.expected_wealth == pytest.approx(
        [100, 110 * g, (110 * g + 10) * g / 2, ((110 * g + 10) * g / 2 + 10) * g], rel=1e-12
    )


def test_a_glide_path_changes_law_at_its_ends() -> None:
    legs = (Leg(2.0, log_normal(0.08, 0.3)), Leg(5.0, log_normal(0.03, 0.1)))
    figures = outlook(plan(100, (), 5, 130, legs))
    mean, deviation = 2 * 0.08 + 3 * 0.03, np.sqrt(2 * 0.09 + 3 * 0.01)
    assert figures.success_probability == pytest.approx(ndtr((mean - np.log(1.3)) / deviation), abs=1e-13)
    assert figures.by_year.expected_wealth[2] == pytest.approx(100 * np.exp(2 * (0.08 + 0.045)), rel=1e-13)


def test_running_out_in_a_lifetime() -> None:
    years: Numbers = np.arange(40.0)
    life = GompertzLife(65, 88, 9.5)
    figures = outlook(plan(100, SPENDING, 40, 0, GROWTH, lifetime=Lifetime((life,))))
    increments = np.diff(np.append(figures.by_year.depletion_probability, figures.depletion_probability))[:40]
    assert figures.lifetime_depletion_probability == pytest.approx(increments @ life.survival(years), abs=1e-12)
    assert figures.alive_at_horizon == pytest.approx(float(life.survival(number(40))))
    codes = [caution.code for caution in figures.cautions]
    assert "life_beyond_horizon" not in codes
    eternal = Lifetime((TableLife((1.0,) * 40),))
    ever = outlook(plan(100, SPENDING, 40, 0, GROWTH, lifetime=eternal))
    assert ever.lifetime_depletion_probability == pytest.approx(ever.depletion_probability, abs=1e-14)
    (beyond,) = (caution for caution in ever.cautions if caution.code == "life_beyond_horizon")
    assert beyond.params == {"alive_at_horizon": 1.0}
    assert outlook(plan()).lifetime_depletion_probability is None


def test_outcomes_stand_for_equally_likely_ones() -> None:
    figures = outlook(plan(100, SPENDING, 10, 50, GROWTH), outcomes_count=4)
    assert figures.outcomes is not None
    assert np.all(np.diff(figures.outcomes) >= 0)
    lump = outlook(plan(100, (), 1, 50, GROWTH), outcomes_count=1)
    assert lump.outcomes == pytest.approx([100 * np.exp(0.05)], rel=1e-10)


def test_sensitivities_are_differences_of_outlooks() -> None:
    growth = returns(expected_return=0.05, volatility=0.15)
    flows = [CashFlow(5, "year", 0, 5), CashFlow(-6, "year", 5, 10)]
    asked = plan(100, flows, 10, 120, growth)
    base = outlook(asked, with_sensitivities=True)
    found = base.sensitivities
    assert found is not None
    more = returns(expected_return=0.06, volatility=0.15)
    riskier = returns(expected_return=0.05, volatility=0.16)
    longer = [flows[0], CashFlow(-6, "year", 5, 11)]
    expected = [
        success(plan(100, flows, 10, 120, more)),
        success(plan(100, flows, 10, 120, riskier)),
        success(plan(100, [CashFlow(5.5, "year", 0, 5), flows[1]], 10, 120, growth)),
        success(plan(100, longer, 11, 120, growth)),
    ]
    assert np.array(found) == pytest.approx(np.array(expected) - base.success_probability, abs=1e-12)
    legs = (Leg(4.0, growth), Leg(10.0, growth))
    assert outlook(plan(100, flows, 10, 120, legs), with_sensitivities=True).sensitivities == pytest.approx(
        found, abs=1e-11
    )
    assert outlook(asked).sensitivities is None


def test_a_sensitivity_that_cannot_be_computed_is_nan() -> None:
    seen = returns("empirical", observations=[-0.1, 0.0, 0.2])
    found = outlook(plan(100, (), 3, 120, seen), with_sensitivities=True).sensitivities
    assert found is not None
    assert np.isnan(found.expected_return)
    assert not np.isnan(found.horizon_years)
    months = returns("normal", expected_return=0.0, volatility=0.01, period="month", periods_per_year=4 / 3)
    part = outlook(plan(100, (), 3, 120, months), with_sensitivities=True).sensitivities
    assert part is not None
    assert np.isnan(part.horizon_years)


def test_an_inexact_mean_widens_the_law() -> None:
    growth = log_normal(0.05, 0.2, sample_size=25)
    lump = outlook(plan(100, (), 10, 130, growth, parameter_uncertainty="predictive"))
    deviation = np.sqrt(10 * 0.04 + 100 * 0.04 / 25)
    assert lump.success_probability == pytest.approx(ndtr((0.5 - np.log(1.3)) / deviation), abs=1e-11)
    assert lump.expected_wealth == pytest.approx(100 * np.exp(0.5 + deviation**2 / 2), rel=1e-10)
    assert lump.by_year.bands[2].wealth[-1] == pytest.approx(100 * np.exp(0.5), rel=1e-9)
    asked = plan(100, SPENDING, 10, 50, growth, parameter_uncertainty="predictive")
    figures = outlook(asked)
    known = dataclasses.replace(asked, parameter_uncertainty="ignored")

    def given(surprise: float) -> float:
        return success(dataclasses.replace(known, legs=(Leg(None, log_normal(0.05 + 0.04 * surprise, 0.2)),)))

    mean = hermite_mean(given, 60)
    assert figures.success_probability == pytest.approx(mean, abs=1e-9)
    assert abs(figures.success_probability - mean) <= max(figures.numerical_error, 1e-9)
    assert "estimates_taken_as_true" not in [caution.code for caution in figures.cautions]
    # certain so far: all surprises agree
    assert figures.by_year.bands[0].wealth[0] == 100


def test_what_every_reader_is_told() -> None:
    codes = [caution.code for caution in outlook(plan(100, SPENDING, 10, 50, GROWTH)).cautions]
    assert codes == [
        "success_hides_size",
        "bands_are_not_paths",
        "mean_above_typical",
        "same_spending_whatever_happens",
        "estimates_taken_as_true",
    ]
    sure = [caution.code for caution in outlook(plan(100, (), 10, 50, log_normal(0.0, 0.0))).cautions]
    assert sure == ["success_hides_size", "bands_are_not_paths", "estimates_taken_as_true"]
