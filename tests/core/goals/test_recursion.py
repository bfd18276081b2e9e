"""The recursion against closed forms, other methods, finer runs, and its own identities."""

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtr

from service.core.arrays import Numbers
from service.core.goals import CashFlow, Leg, Outlook, outlook
from service.core.goals.normal_growth import NormalGrowth
from service.core.goals.quadrature import Quadrature
from service.core.goals.recursion import Recursion
from service.core.goals.work import Work
from tests.core.goals.build import at_steps, log_normal, plan
from tests.core.goals.exact import backward, simulated


def found(initial_value: float, flows: Numbers, mean: float, deviation: float, target: float) -> Outlook:
    return outlook(plan(initial_value, at_steps(flows, 1), len(flows), target, log_normal(mean, deviation)))


def test_one_step_is_one_normal_probability() -> None:
    figures = found(100.0, np.array([20.0]), 0.04, 0.2, 130.0)
    assert figures.success_probability == pytest.approx(ndtr((np.log(120 / 130) + 0.04) / 0.2), abs=1e-15)
    assert figures.expected_wealth == pytest.approx(120 * np.exp(0.06), rel=1e-14)


@pytest.mark.parametrize("flow", [60.0, -70.0, 1e-3, -1e-3, 1e5])
def test_two_steps_are_one_integral(flow: float) -> None:
    v0, m, s, target = 100.0, 0.03, 0.25, 90.0
    figures = found(v0, np.array([0.0, flow]), m, s, target)
    with mp.workdps(25):

        def paid(z: mp.mpf) -> mp.mpf:
            left = v0 * mp.exp(m + s * z) + flow
            return mp.ncdf((mp.log(left / target) + m) / s) * mp.npdf(z) if left > 0 else mp.mpf(0)

        edge = (mp.log(-flow / v0) - m) / s if flow < 0 else mp.mpf(-12)
        edge = max(edge, mp.mpf(-12))
        exact = mp.quad(paid, [edge, edge + mp.mpf("0.01"), edge + 1, *range(int(edge) + 3, 13, 2), 13])
        depleted = mp.ncdf(edge) if flow < 0 else mp.mpf(0)
    assert figures.success_probability == pytest.approx(float(exact), abs=1e-12)
    assert figures.depletion_probability == pytest.approx(float(depleted), abs=1e-14)


@pytest.mark.parametrize(
    ("initial_value", "flows", "mean", "deviation", "target"),
    [
        (10_000.0, np.full(12, 3_000.0), 0.04, 0.15, 55_000.0),
        (100_000.0, np.full(12, -9_000.0), 0.04, 0.15, 40_000.0),
        (30_000.0, np.array([5e3] * 6 + [-8e3] * 6), 0.05, 0.2, 10_000.0),
        (30_000.0, np.array([-5e3, 4e3] * 5), 0.05, 0.3, 20_000.0),
    ],
)
def test_agrees_with_the_recursion_backward_in_time(
    initial_value: float, flows: Numbers, mean: float, deviation: float, target: float
) -> None:
    figures = found(initial_value, flows, mean, deviation, target)
    success, depleted = backward(initial_value, flows, mean, deviation, target)
    assert figures.success_probability == pytest.approx(success, abs=1e-6)
    assert figures.depletion_probability == pytest.approx(depleted, abs=1e-6)


def test_simulation_agrees_roughly() -> None:
    flows = np.array([-5e3, 4e3, -7e3, -7e3, 2e3] * 4)
    figures = found(80_000.0, flows, 0.04, 0.2, 30_000.0)
    success, depleted, mean = simulated(80_000.0, flows, lambda rng, n: np.exp(rng.normal(0.04, 0.2, n)), 30_000.0)
    assert figures.success_probability == pytest.approx(success, abs=5e-3)
    assert figures.depletion_probability == pytest.approx(depleted, abs=5e-3)
    assert figures.expected_wealth == pytest.approx(mean, rel=0.02)


@pytest.mark.parametrize("seed", range(50))
def test_the_stated_error_is_not_below_the_true_one(seed: int) -> None:
    rng = np.random.default_rng(seed)
    steps = int(rng.integers(2, 80))
    size = 10 ** rng.uniform(-1, 4)
    shape = rng.integers(4)
    amounts = [np.ones(steps), -np.ones(steps), np.sign(rng.normal(size=steps)), rng.normal(size=steps)][shape] * size
    value, target = float(10 ** rng.uniform(2, 5)), float(10 ** rng.uniform(2, 6))
    mean, deviation = float(rng.uniform(-0.05, 0.1)), float(10 ** rng.uniform(-2, -0.3))
    figures = found(value, amounts, mean, deviation, target)
    growth = NormalGrowth(np.full(steps, mean), np.full(steps, deviation**2))
    flows = np.append(amounts, 0.0)
    fine = Recursion(flows, growth, frozenset([steps]), Quadrature(Work()), target, averages=False, ratio=3.0)
    course = fine.run(value)
    true = abs(course.wealth[steps].solvent_at_least(target) - figures.success_probability)
    true = max(true, abs(course.depletion_probability() - figures.depletion_probability))
    assert true <= figures.numerical_error
    assert figures.numerical_error < 1e-9


amounts = st.lists(st.floats(-3e4, 3e4).map(lambda c: round(c, 2)), min_size=1, max_size=8)


@settings(max_examples=25, deadline=None)
@given(amounts, st.floats(0, 1e5), st.floats(0.05, 0.4), st.floats(1, 1e5))
def test_the_three_outcomes_add_up(flows: list[float], value: float, deviation: float, target: float) -> None:
    figures = found(value, np.array(flows), 0.03, deviation, target)
    parts = figures.success_probability, figures.depletion_probability, figures.solvent_below_target_probability
    assert sum(parts) == pytest.approx(1, abs=1e-11)
    assert min(parts) >= 0
    assert np.all(np.diff(figures.by_year.depletion_probability) >= -1e-13)
    for low, high in zip(figures.by_year.bands, figures.by_year.bands[1:], strict=False):
        assert np.all(low.wealth <= high.wealth * (1 + 1e-9) + 1e-9)


@settings(max_examples=20, deadline=None)
@given(amounts, st.floats(0, 1e5), st.floats(0, 1e4), st.integers(0, 7), st.floats(0, 1e4))
def test_more_money_never_hurts(flows: list[float], value: float, more: float, place: int, extra: float) -> None:
    base = found(value, np.array(flows), 0.03, 0.2, 2e4)
    richer = found(value + more, np.array(flows), 0.03, 0.2, 2e4)
    helped = np.array(flows)
    helped[place % len(flows)] += extra
    better = found(value, helped, 0.03, 0.2, 2e4)
    for other in (richer, better):
        assert other.success_probability >= base.success_probability - 1e-10
        assert other.depletion_probability <= base.depletion_probability + 1e-10


def test_money_has_no_unit() -> None:
    flows = np.array([-5e3, 4e3, -7e3, -7e3, 2e3] * 2)
    one = found(8e4, flows, 0.04, 0.2, 3e4)
    other = found(8e4 * 7.3e-6, flows * 7.3e-6, 0.04, 0.2, 3e4 * 7.3e-6)
    assert one.success_probability == pytest.approx(other.success_probability, abs=1e-12)
    assert one.expected_gap * 7.3e-6 == pytest.approx(other.expected_gap, rel=1e-10)


@pytest.mark.parametrize("deviation", [0.05, 0.6, 1.5])
def test_the_mean_obeys_its_own_recursion_when_nothing_can_fail(deviation: float) -> None:
    flows = np.full(40, 100.0)
    figures = found(50.0, flows, 0.01, deviation, 1.0)
    mean, factor = 50.0, np.exp(0.01 + deviation**2 / 2)
    for flow in flows:
        mean = (mean + flow) * factor
    assert figures.expected_wealth == pytest.approx(mean, rel=1e-12)


def test_the_mean_with_withdrawals_is_that_of_the_law_of_wealth() -> None:
    # E[V] by an integral of P(V >= v), which comes from the points alone
    flows = np.full(10, -100.0)
    growth = NormalGrowth(np.full(10, 0.02), np.full(10, 0.04))
    course = Recursion(np.append(flows, 0), growth, frozenset([4, 10]), Quadrature(Work())).run(900.0)
    for date in (4, 10):
        v = np.geomspace(1e-6, 1e6, 40_001)
        above = np.array([course.wealth[date].solvent_at_least(float(x)) for x in v])
        integral = float(((above[1:] + above[:-1]) / 2) @ np.diff(v)) + 1e-6 * above[0]
        assert course.expected[date] == pytest.approx(integral, rel=1e-6)


def test_the_gap_is_the_integral_of_the_chance() -> None:
    flows = np.array([0.0, -300.0, 200.0, -300.0])
    growth = NormalGrowth(np.full(4, 0.02), np.full(4, 0.09))
    for closing in (0.0, 50.0, -120.0):
        course = Recursion(np.append(flows, closing), growth, frozenset([4]), Quadrature(Work()), 1.0).run(900.0)
        wealth = course.wealth[4]
        levels = np.linspace(1e-9, 800, 20_001)
        below = 1 - np.array([wealth.solvent_at_least(float(x)) for x in levels])
        integral = float(((below[1:] + below[:-1]) / 2) @ np.diff(levels))
        assert wealth.gap(800.0) == pytest.approx(integral, rel=1e-7)


@pytest.mark.parametrize("deviation", [0.01, 0.001, 1e-4])
def test_what_cannot_survive_the_next_withdrawal_is_depleted_then(deviation: float) -> None:
    # without volatility the money is gone after 20 of 26 withdrawals
    figures = found(1000.0, np.full(26, -50.0), 0.0, deviation, 10.0)
    assert figures.depletion_probability == pytest.approx(1, abs=1e-11)
    # what is left then just pays the twentieth, or just fails to
    assert figures.by_year.depletion_probability[20] == pytest.approx(0.5, abs=0.01)
    jump = found(1000.0, np.array([0.0, -500, -500_000, 5.0, 0.0]), 0.0, deviation, 10.0)
    assert jump.depletion_probability == pytest.approx(1, abs=1e-13)
    assert jump.by_year.depletion_probability == pytest.approx([0, 0, 0, 1, 1, 1], abs=1e-13)
    assert jump.by_year.expected_wealth[2] == pytest.approx(500 * np.exp(deviation**2 / 2), rel=1e-2)


def test_what_comes_in_at_the_end_does_not_revive_the_depleted() -> None:
    flows = [CashFlow(-100, "once", 1), CashFlow(1000, "year", 2, timing="end")]
    figures = outlook(plan(100, flows, 3, 500, log_normal(0.0, 0.2)), outcomes_count=10)
    assert figures.depletion_probability == pytest.approx(0.5, abs=1e-12)
    assert figures.outcomes is not None
    assert figures.outcomes[:5].tolist() == [0.0] * 5
    assert np.all(figures.outcomes[5:] > 1000)
    assert figures.success_probability == pytest.approx(0.5, abs=1e-12)
    assert figures.expected_gap == pytest.approx(250, rel=1e-10)


def test_sixty_years_of_alternating_months() -> None:
    months = np.where(np.arange(720) % 2 == 0, 900.0, -1000.0)
    figures = outlook(plan(50_000, at_steps(months, 12), 60, 10_000, log_normal(0.05, 0.15)))
    assert 0 < figures.success_probability < 1
    assert figures.numerical_error < 1e-10


def test_certain_legs_between_random_ones() -> None:
    # the middle leg earns 10 % for certain: its flows are worth their discounted sum at its start
    risky, safe = log_normal(0.03, 0.2), log_normal(np.log(1.1), 0.0)
    legs = (Leg(3.0, risky), Leg(6.0, safe), Leg(9.0, risky))
    rate = 1 / 1.1
    for middle in ([100.0, 50.0, 20.0], [-100.0, -50.0, -20.0]):
        flows = [0.0, 10.0, 10.0, *middle, 0.0, 5.0, 5.0]
        through = outlook(plan(1000, at_steps(flows, 1), 9, 1200, legs))
        merged = [0.0, 10.0, 10.0, middle[0] + middle[1] * rate + middle[2] * rate**2, 0, 0, 0.0, 5.0, 5.0]
        at_once = outlook(plan(1000, at_steps(merged, 1), 9, 1200, legs))
        assert through.success_probability == pytest.approx(at_once.success_probability, abs=1e-12)
        assert through.expected_wealth == pytest.approx(at_once.expected_wealth, rel=1e-11)


def test_a_withdrawal_must_be_paid_even_if_money_comes_for_certain() -> None:
    legs = (Leg(2.0, log_normal(0.03, 0.2)), Leg(4.0, log_normal(0.0, 0.0)), Leg(6.0, log_normal(0.03, 0.2)))
    flows = [0.0, 0.0, -80.0, 100.0, 0.0, 0.0]
    figures = outlook(plan(100, at_steps(flows, 1), 6, 120, legs))
    deviation = 0.2 * np.sqrt(2)
    unpaid = ndtr((np.log(0.8) - 0.06) / deviation)
    assert figures.depletion_probability == pytest.approx(unpaid, abs=1e-12)
    z = np.linspace((np.log(0.8) - 0.06) / deviation, 9, 400_001)
    left = 100 * np.exp(0.06 + deviation * z) + 20
    reached = ndtr((np.log(left / 120) + 0.06) / deviation) * np.exp(-z * z / 2) / np.sqrt(2 * np.pi)
    assert figures.success_probability == pytest.approx(np.trapezoid(reached, z), abs=1e-9)
    # what comes in and goes out again while nothing is at risk changes nothing
    idle = outlook(plan(100, at_steps([0, 0, 50.0, -50.0, 0, 0], 1), 6, 120, legs))
    assert idle.success_probability == pytest.approx(
        outlook(plan(100, (), 6, 120, legs)).success_probability, abs=1e-12
    )


def test_flows_that_end_a_period_count_before_success_is_judged() -> None:
    growth = log_normal(0.05, 0.2)
    flows = [CashFlow(100, "year", timing="end")]
    ends = outlook(plan(100, flows, 1, 210, growth))
    assert ends.success_probability == pytest.approx(ndtr((np.log(100 / 110) + 0.05) / 0.2), abs=1e-14)
    pays = outlook(plan(100, [CashFlow(-100, "year", timing="end")], 1, 10, growth))
    assert pays.depletion_probability == pytest.approx(ndtr(-0.05 / 0.2), abs=1e-14)
    assert pays.by_year.depletion_probability[-1] == pays.depletion_probability
    assert pays.success_probability == pytest.approx(ndtr((np.log(100 / 110) + 0.05) / 0.2), abs=1e-14)
    assert pays.by_year.bands[-1].wealth[-1] == pytest.approx(100 * (np.exp(0.05 + 0.2 * 1.6448536269514722) - 1))
