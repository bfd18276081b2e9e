"""Plans under return models whose law does not divide: the lattice, and outcomes listed."""

from typing import Any

import numpy as np
import pytest
from scipy.special import comb

from service.core.arrays import Numbers
from service.core.goals import CashFlow, Leg, outlook, requirement
from service.core.goals.step_law import step_law
from service.core.goals.step_transform import StepTransform, outer_transform
from tests.core.goals.build import at_steps, log_normal, plan, returns
from tests.core.goals.exact import hermite_mean, simulated

SAVING, SPENDING = (CashFlow(5, "year"),), (CashFlow(-9, "year"),)


@pytest.mark.parametrize("flows", [SAVING, SPENDING, (CashFlow(5, "year", 0, 5), CashFlow(-9, "year", 5))])
def test_a_mixture_of_one_law_is_that_law(flows: tuple[CashFlow, ...]) -> None:
    exact = outlook(plan(100, flows, 15, 110, returns(expected_return=0.05, volatility=0.2)))
    mixed = returns("lognormal_mixture", components=[[1.0, 0.05, 0.2]])
    found = outlook(plan(100, flows, 15, 110, mixed))
    assert found.method == "lattice_fourier"
    assert found.success_probability == pytest.approx(exact.success_probability, abs=1e-11)
    error = found.numerical_error
    assert error < 1e-9
    assert found.by_year.depletion_probability == pytest.approx(exact.by_year.depletion_probability, abs=error)
    assert found.expected_wealth == pytest.approx(exact.expected_wealth, rel=1e-10)
    assert found.expected_gap == pytest.approx(exact.expected_gap, rel=1e-9)
    for band, other in zip(found.by_year.bands, exact.by_year.bands, strict=True):
        assert band.wealth == pytest.approx(other.wealth, rel=1e-8, abs=1e-3)


MODELS: dict[str, dict[str, Any]] = {
    "normal": {"expected_return": 0.05, "volatility": 0.25},
    "student_t": {"expected_return": 0.05, "volatility": 0.2, "degrees_of_freedom": 4},
    "cornish_fisher": {"expected_return": 0.05, "volatility": 0.2, "skewness": -0.6, "excess_kurtosis": 1.5},
    "normal_mixture": {"components": [[0.8, 0.1, 0.1], [0.2, -0.2, 0.4]]},
    "up_down": {"up_return": 0.1, "down_return": -0.08, "up_probability": 0.55, "moves": 5},
    "empirical": {"observations": [-1.0, -0.3, -0.1, 0.02, 0.05, 0.08, 0.1, 0.12, 0.2, 0.3, 0.4, 0.1]},
}


def drawn(model: str, rng: np.random.Generator, count: int) -> Numbers:
    return np.maximum(1 + np.asarray(drawn_return(model, rng, count), np.float64), 0)


def drawn_return(model: str, rng: np.random.Generator, count: int) -> Any:
    given = MODELS[model]
    if model in {"normal", "cornish_fisher", "student_t"}:
        z = rng.standard_normal(count)
        if model == "student_t":
            z = rng.standard_t(4, count) / np.sqrt(2)
        if model == "cornish_fisher":
            s, k = -0.6, 1.5
            z = z + (z**2 - 1) * s / 6 + (z**3 - 3 * z) * k / 24 - (2 * z**3 - 5 * z) * s**2 / 36
        return given["expected_return"] + given["volatility"] * z
    if model == "normal_mixture":
        calm = rng.random(count) < 0.8
        return np.where(calm, rng.normal(0.1, 0.1, count), rng.normal(-0.2, 0.4, count))
    if model == "up_down":
        ups = rng.binomial(5, 0.55, count)
        return 1.1**ups * 0.92 ** (5 - ups) - 1
    return rng.choice(np.array(given["observations"]), count)


@pytest.mark.parametrize("model", MODELS)
def test_simulation_agrees_roughly(model: str) -> None:
    flows = np.array([10, 10, -12, -12, 5, -12, -12, -12, -12, -12.0])
    found = outlook(plan(100, at_steps(flows, 1), 10, 80, returns(model, **MODELS[model])))
    success, depleted, mean = simulated(100, flows, lambda rng, n: drawn(model, rng, n), 80)
    assert found.success_probability == pytest.approx(success, abs=4e-3)
    assert found.depletion_probability == pytest.approx(depleted, abs=4e-3)
    assert found.expected_wealth == pytest.approx(mean, rel=0.02)
    parts = found.success_probability + found.depletion_probability + found.solvent_below_target_probability
    assert parts == pytest.approx(1, abs=1e-8)


def test_total_losses_deplete_and_are_said() -> None:
    growth = returns("normal", expected_return=0.05, volatility=0.5)
    found = outlook(plan(100, (), 3, 50, growth))
    lost = 1 - (1 - 0.017864420562816563) ** 3
    assert found.depletion_probability == pytest.approx(lost, rel=1e-9)
    assert found.by_year.depletion_probability[1] == pytest.approx(0.017864420562816563, rel=1e-9)
    (caution,) = (c for c in found.cautions if c.code == "growth_below_zero")
    assert caution.params["total_loss_probability"] == pytest.approx(lost, rel=1e-9)
    certain = outlook(plan(100, [CashFlow(10, "year")], 3, 50, returns("normal", expected_return=-1, volatility=0)))
    assert certain.depletion_probability == 1
    assert certain.expected_wealth == 0
    legs = (
        Leg(1.0, returns("normal", expected_return=0.05, volatility=0.1)),
        Leg(2.0, returns("normal", expected_return=-1, volatility=0)),
        Leg(3.0, returns("normal", expected_return=0.05, volatility=0.1)),
    )
    ends = outlook(plan(100, [CashFlow(10, "year")], 3, 50, legs))
    assert ends.depletion_probability == pytest.approx(1, abs=1e-12)
    assert ends.by_year.depletion_probability == pytest.approx([0, 0, 1, 1], abs=1e-12)


def test_every_outcome_is_listed_where_they_are_few() -> None:
    seen = np.array([-0.4, 0.1, 0.5])
    flows = np.array([0.0, -30, 20, -50])
    found = outlook(plan(100, at_steps(flows, 1), 4, 60, returns("empirical", observations=seen.tolist())))
    assert found.method == "enumeration"
    paths = np.stack(np.meshgrid(*[seen] * 4), axis=-1).reshape(-1, 4)
    value, alive = np.full(81, 100.0), np.ones(81, bool)
    for step, flow in enumerate(flows):
        alive &= value + flow >= -1e-9 * abs(flow)
        value = np.where(alive, np.maximum(value + flow, 0), 0) * (1 + paths[:, step])
    assert found.success_probability == pytest.approx((alive & (value >= 60)).mean(), abs=1e-14)
    assert found.depletion_probability == pytest.approx((~alive).mean(), abs=1e-14)
    assert found.expected_wealth == pytest.approx(value.mean(), rel=1e-14)
    assert found.expected_gap == pytest.approx(np.maximum(60 - value, 0).mean(), rel=1e-13)
    assert found.by_year.bands[2].wealth[-1] == pytest.approx(np.sort(value)[40])
    asked = plan(100, at_steps(flows, 1), 4, (), returns("empirical", observations=seen.tolist()))
    target = requirement(asked, "target", 0.5)
    assert (value >= target.value * (1 - 1e-12)).mean() >= 0.5
    assert (value > target.value * (1 + 1e-12)).mean() < 0.5
    assert target.outlook is not None
    assert target.outlook.success_probability >= 0.5
    closing = plan(
        100, [CashFlow(-70, "year", 3, timing="end")], None, 10, returns("empirical", observations=[-0.4, 0.5])
    )
    assert requirement(closing, "horizon_years", 0.9).value == 1


def test_a_move_up_and_down_recombines() -> None:
    moves = returns("up_down", up_return=0.1, down_return=-0.1, up_probability=0.5, moves=1)
    found = outlook(plan(100, (), 40, 100, moves))
    assert found.method == "enumeration"
    ups = np.arange(41)
    values = 100 * 1.1**ups * 0.9 ** (40 - ups)
    assert found.success_probability == pytest.approx(comb(40, ups[values >= 100]).sum() / 2.0**40, abs=1e-13)


def test_many_outcomes_are_taken_as_smooth_and_that_is_said() -> None:
    growth = returns("up_down", up_return=0.03, down_return=-0.025, up_probability=0.55, moves=12)
    found = outlook(plan(100, SPENDING, 12, 50, growth))
    assert found.method == "lattice_fourier"
    assert found.numerical_error > 1e-9
    (caution,) = (c for c in found.cautions if c.code == "discrete_law_approximated")
    assert caution.params == {"numerical_error": found.numerical_error}


def test_an_infinite_mean_is_infinite_and_the_rest_is_finite() -> None:
    heavy = returns("student_t", compounding="continuous", expected_return=0.05, volatility=0.2, degrees_of_freedom=3)
    for flows in (SAVING, SPENDING):
        found = outlook(plan(100, flows, 10, 100, heavy))
        assert found.expected_wealth == np.inf
        assert np.isfinite(found.expected_gap)
        assert found.numerical_error < 1e-5
        assert "mean_above_typical" in [caution.code for caution in found.cautions]


def test_the_stated_error_of_the_lattice_is_not_below_the_true_one() -> None:
    rng = np.random.default_rng(7)
    for _ in range(12):
        steps, deviation = int(rng.integers(3, 30)), float(10 ** rng.uniform(-1.5, -0.3))
        mean, size = float(rng.uniform(-0.02, 0.08)), float(10 ** rng.uniform(-1, 1.2))
        amounts = rng.choice([-1.0, 1.0]) * np.where(rng.random(steps) < 0.2, -1, 1) * size
        exact = outlook(
            plan(100, at_steps(amounts, 1), steps, 120, returns(expected_return=mean, volatility=deviation))
        )
        mixed = returns("lognormal_mixture", components=[[0.5, mean, deviation], [0.5, mean, deviation]])
        found = outlook(plan(100, at_steps(amounts, 1), steps, 120, mixed))
        true = np.abs(found.by_year.depletion_probability - exact.by_year.depletion_probability).max()
        true = max(float(true), abs(found.success_probability - exact.success_probability))
        assert true <= found.numerical_error + exact.numerical_error


def test_legs_of_different_kinds_share_a_plan() -> None:
    calm = returns(expected_return=0.03, volatility=0.08)
    mixed = returns("lognormal_mixture", components=[[1.0, 0.05, 0.2]])
    same = returns(expected_return=0.05, volatility=0.2)
    flows = [CashFlow(-4, "year", 0, 5), CashFlow(-2, "quarter", 5)]
    sure = returns(expected_return=0.02, volatility=0.0)
    legs = (Leg(5.0, mixed), Leg(8.0, calm), Leg(9.0, sure), Leg(12.0, calm))
    exact = outlook(plan(100, flows, 12, 80, (Leg(5.0, same), *legs[1:])))
    found = outlook(plan(100, flows, 12, 80, legs))
    assert found.success_probability == pytest.approx(exact.success_probability, abs=1e-10)
    assert found.expected_wealth == pytest.approx(exact.expected_wealth, rel=1e-10)


def test_an_inexact_mean_of_simple_returns() -> None:
    growth = returns("normal", expected_return=0.05, volatility=0.2, sample_size=16)
    found = outlook(plan(100, SPENDING, 6, 80, growth, parameter_uncertainty="predictive"))

    def given(surprise: float) -> float:
        other = returns("normal", expected_return=0.05 + 0.05 * surprise, volatility=0.2)
        return outlook(plan(100, SPENDING, 6, 80, other)).success_probability

    assert found.success_probability == pytest.approx(hermite_mean(given, 24), abs=1e-7)


def test_a_heavier_law_is_cut_where_its_tails_hold_little() -> None:
    heavy = returns("student_t", compounding="continuous", expected_return=0.0, volatility=0.1, degrees_of_freedom=2.5)
    with np.errstate(all="ignore"):
        transform = StepTransform.of(step_law(heavy), 30)
        light = StepTransform.of(step_law(log_normal(0.0, 0.1)), 30)
    assert transform.tail > 1e-11
    assert light.tail == 1e-12
    assert light.reach == pytest.approx(0.1 * 7.5, rel=0.05)


def test_the_transform_is_the_characteristic_function() -> None:
    spacing, length = 0.02, 512
    with np.errstate(all="ignore"):
        transform = StepTransform.of(step_law(log_normal(0.03, 0.2)), 1)
        found = transform.transform(spacing, length, 128)
    k = 2 * np.pi / (length * spacing) * np.arange(128)
    assert np.abs(found - np.exp(-((0.2 * k) ** 2) / 2)).max() < 1e-10
    places, masses = np.array([-0.3, 0.1]), np.array([0.4, 0.6])
    direct = np.exp(-1j * np.multiply.outer(np.arange(10) * 0.7, places)) @ masses
    assert np.abs(outer_transform(places, masses, 0.7, 10) - direct).max() < 1e-14


def test_a_withdrawal_nobody_can_pay_empties_the_lattice() -> None:
    growth = returns("normal", expected_return=0.05, volatility=0.1)
    found = outlook(plan(10, [CashFlow(-1e9, "once", 2), CashFlow(50, "year", 3)], 5, 1, growth))
    assert found.success_probability == 0
    assert found.depletion_probability == pytest.approx(1, abs=1e-12)
    far = outlook(plan(10, [CashFlow(-1, "year", 1), CashFlow(-600, "once", 3)], 5, 1, growth))
    assert far.depletion_probability == pytest.approx(1, abs=1e-12)


def test_all_or_nothing_beside_a_smooth_law() -> None:
    stake = returns("up_down", up_return=0.2, down_return=-1.0, up_probability=0.9, moves=1)
    legs = (Leg(2.0, stake), Leg(4.0, returns(expected_return=0.05, volatility=0.2)))
    found = outlook(plan(100, [CashFlow(10, "year")], 4, 200, legs))
    certain = plan(
        (110 * 1.2 + 10) * 1.2, [CashFlow(10, "year")], 2, 200, returns(expected_return=0.05, volatility=0.2)
    )
    exact = outlook(certain)
    assert found.depletion_probability == pytest.approx(0.19, abs=1e-11)
    assert found.success_probability == pytest.approx(0.81 * exact.success_probability, abs=1e-9)


@pytest.mark.parametrize("deviation", [1e-7, 1e-4, 5e-3])
def test_a_law_narrow_and_wide_at_once_is_followed_as_finely_as_there_is_time(deviation: float) -> None:
    both = returns("normal_mixture", components=[[0.9, 0.07, deviation], [0.1, -0.3, 0.4]])
    found = outlook(plan(100, SPENDING, 10, 50, both))

    def growth(rng: np.random.Generator, count: int) -> Numbers:
        calm = rng.random(count) < 0.9
        drawn_now = np.where(calm, rng.normal(0.07, deviation, count), rng.normal(-0.3, 0.4, count))
        return np.asarray(np.maximum(1 + drawn_now, 0), np.float64)

    success, depleted, _ = simulated(100, np.full(10, -9.0), growth, 50)
    assert found.success_probability == pytest.approx(success, abs=4e-3 + found.numerical_error)
    assert found.depletion_probability == pytest.approx(depleted, abs=4e-3 + found.numerical_error)
