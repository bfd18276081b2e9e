"""What a plan needs: each unknown, both ways of being unattainable, jumps, and what is refused."""

import dataclasses
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtri

from service.core.errors import DoesNotFit
from service.core.goals import CashFlow, Leg, Lifetime, Plan, Requirement, Shock, TableLife, outlook, requirement
from service.core.goals.boundary import Boundary, _Search, boundary, interpolated, least_reaching
from tests.core.goals.build import log_normal, plan, returns

SAVING = (CashFlow(300, "month"),)
OPEN = (CashFlow(None, "month"),)


def test_the_example_requirement() -> None:
    found = requirement(plan(10_000, [CashFlow(None, "month", 0, 5)], 5, 32_000), "contribution", 0.85)
    assert found.outcome == "found"
    assert found.value == pytest.approx(387.9583452, abs=6e-8)
    assert found.value_path == ("cash_flows", 0, "amount")
    printed = [(1, 388, 0.850100496197), (10, 390, 0.854868588135), (100, 400, 0.877056990228)]
    assert [row.to for row in found.rounded] == [row[0] for row in printed]
    assert [row.value for row in found.rounded] == [row[1] for row in printed]
    assert [row.success_probability for row in found.rounded] == pytest.approx([row[2] for row in printed], abs=1e-11)
    assert found.attainable_success_probability is None
    assert found.holds_after is None
    figures = found.outlook
    assert figures is not None
    assert figures.success_probability == pytest.approx(0.85, abs=1e-10)
    assert figures.expected_gap == pytest.approx(396.628178, abs=6e-7)
    assert figures.mean_gap_if_missed == pytest.approx(2644.18785, abs=6e-6)
    assert figures.expected_wealth == pytest.approx(39178.9069, abs=6e-5)
    assert figures.by_year.bands[0].wealth[1:] == pytest.approx(
        [12948.3744, 16792.4525, 20737.3164, 24744.9014, 28810.8155], abs=6e-5
    )
    assert figures.by_year.bands[2].wealth[-1] == pytest.approx(38444.7291, abs=6e-5)
    assert found.method == "bracketed_root_of_outlook"
    assert found.numerical_error == 1e-11
    assert found.cautions == ()


def holds(found: Requirement, wanted: float) -> None:
    assert found.outcome == "found"
    assert found.outlook is not None
    assert found.outlook.success_probability == pytest.approx(wanted, abs=1e-10)
    assert found.cautions == ()
    for row in found.rounded:
        assert row.success_probability >= wanted - 1e-12


def test_an_initial_value() -> None:
    found = requirement(plan(None, SAVING, 5, 32_000), "initial_value", 0.9)
    holds(found, 0.9)
    assert found.value_path == ("initial_value",)
    assert [row.value for row in found.rounded] == [np.ceil(found.value / to) * to for to in (1, 10, 100)]
    # without flows it is a normal quantile
    lump = requirement(plan(None, (), 4, 1000, log_normal(0.05, 0.2)), "initial_value", 0.9)
    assert lump.value == pytest.approx(1000 * np.exp(-0.2 - 0.4 * ndtri(0.1)), rel=1e-9)


def test_a_target_is_a_quantile() -> None:
    found = requirement(plan(10_000, SAVING, 5, ()), "target", 0.95)
    assert found.value == pytest.approx(outlook(plan(10_000, SAVING, 5, 1)).by_year.bands[0].wealth[-1], rel=1e-9)
    assert found.outlook is not None
    assert found.outlook.success_probability == pytest.approx(0.95, abs=1e-10)
    assert [row.value for row in found.rounded] == [np.floor(found.value / to) * to for to in (1, 10, 100)]
    assert found.method == "lognormal_mixture_quadrature"
    spent = requirement(plan(10_000, [CashFlow(-900, "month")], 2, ()), "target", 0.5)
    assert spent.outcome == "unattainable"
    assert spent.attainable_success_probability == pytest.approx(0, abs=1e-12)


def test_a_withdrawal_is_below_zero_and_rounded_towards_it() -> None:
    found = requirement(plan(500_000, OPEN, 30, 100_000), "withdrawal", 0.85)
    holds(found, 0.85)
    assert found.value < 0
    assert [row.value for row in found.rounded] == [np.ceil(found.value / to) * to for to in (1, 10, 100)]
    solvent = requirement(plan(500_000, OPEN, 30, 100_000), "withdrawal", 0.85, of="solvency")
    assert solvent.value < found.value
    assert solvent.outlook is not None
    assert solvent.outlook.depletion_probability == pytest.approx(0.15, abs=1e-10)


def test_no_withdrawal_is_too_small_where_the_target_is_out_of_reach() -> None:
    found = requirement(plan(500_000, OPEN, 30, 1e8), "withdrawal", 0.85)
    assert found.outcome == "unattainable"
    assert np.isnan(found.value)
    assert found.outlook is None
    assert found.rounded == ()
    alone = outlook(plan(500_000, (), 30, 1e8))
    assert found.attainable_success_probability == pytest.approx(alone.success_probability, abs=1e-12)


def test_no_contribution_helps_once_depleted() -> None:
    flows = (CashFlow(-1000, "month", to_year=1), CashFlow(None, "month", from_year=2))
    found = requirement(plan(11_000, flows, 10, 5_000), "contribution", 0.9)
    assert found.outcome == "unattainable"
    solvent = 1 - outlook(plan(11_000, flows[:1], 10, 5_000)).depletion_probability
    assert found.attainable_success_probability == pytest.approx(solvent, abs=1e-10)


def test_nothing_more_is_needed_where_the_plan_succeeds_already() -> None:
    found = requirement(plan(10_000, OPEN, 5, 100), "contribution", 0.9)
    assert found.value == 0
    assert found.cautions == ()
    assert [row.value for row in found.rounded] == [0, 0, 0]


def test_without_volatility_the_chance_jumps() -> None:
    found = requirement(plan(0, [CashFlow(None, "year")], 10, 1000, log_normal(0.0, 0.0)), "contribution", 0.9)
    assert found.value == pytest.approx(100, rel=1e-11)
    assert [caution.code for caution in found.cautions] == ["success_jumps"]
    assert found.outlook is not None
    assert found.outlook.success_probability == 1
    spent = requirement(plan(1000, [CashFlow(None, "year")], 10, 0, log_normal(0.0, 0.0)), "withdrawal", 0.9)
    assert spent.value == pytest.approx(-100, rel=1e-8)
    # nothing is there and nothing comes: nothing can be spent
    broke = requirement(plan(0, [CashFlow(None, "year")], 3, 0, log_normal(0.0, 0.0)), "withdrawal", 0.9)
    assert broke.value == pytest.approx(0, abs=1e-12)


def test_a_horizon_first_and_last() -> None:
    growing = plan(10_000, SAVING, None, 32_000)
    first = requirement(growing, "horizon_years", 0.85)
    assert first.outlook is not None
    assert first.outlook.success_probability >= 0.85
    assert first.holds_after is True
    assert first.value_path == ("horizon_years",)
    shorter = outlook(dataclasses.replace(growing, horizon_years=first.value - 1 / 12))
    assert shorter.success_probability < 0.85
    assert requirement(growing, "horizon_years", 0.85, which="last").outcome == "unattainable"
    spending = plan(500_000, [CashFlow(-2500, "month")], None, 0)
    last = requirement(spending, "horizon_years", 0.85, which="last")
    assert last.holds_after is False
    assert last.outlook is not None
    assert last.outlook.success_probability >= 0.85
    longer = outlook(dataclasses.replace(spending, horizon_years=last.value + 1 / 12))
    assert longer.success_probability < 0.85
    assert requirement(spending, "horizon_years", 0.85).value == pytest.approx(1 / 12)
    solvent = requirement(dataclasses.replace(spending, targets=(1e9,)), "horizon_years", 0.85, "solvency", "last")
    assert solvent.value == last.value


def test_flows_at_the_end_of_a_step_count_where_the_plan_ends_there() -> None:
    closing = plan(100, [CashFlow(50, "year", timing="end")], None, 340, log_normal(0.05, 0.1))
    found = requirement(closing, "horizon_years", 0.5)
    assert found.outlook is not None
    assert found.outlook.success_probability >= 0.5
    before = outlook(dataclasses.replace(closing, horizon_years=found.value - 1))
    assert before.success_probability < 0.5


def test_the_search_ends_with_the_glide_path_and_the_table_of_lives() -> None:
    growth = log_normal(0.05, 0.1)
    legs = (Leg(3.0, growth), Leg(7.0, growth))
    ends = requirement(plan(100, (), None, 1, legs), "horizon_years", 0.5, which="last")
    assert ends.value == 7
    assert ends.holds_after is True
    lives = Lifetime((TableLife((0.9,) * 4),))
    assert requirement(plan(100, (), None, 1, growth, lifetime=lives), "horizon_years", 0.5, which="last").value == 4
    certain = requirement(plan(100, (), None, 200, log_normal(0.1, 0.0)), "horizon_years", 0.5)
    assert certain.value == 7


def test_steps_of_the_search_that_do_not_fit_a_leg_are_refused() -> None:
    monthly = returns("normal", expected_return=0.004, volatility=0.03, period="month")
    yearly = returns("normal", expected_return=0.05, volatility=0.1)
    legs = (Leg(1.0, monthly), Leg(9.0, yearly))
    with pytest.raises(DoesNotFit) as unfit:
        requirement(plan(100, (), None, 150, legs), "horizon_years", 0.5)
    (refusal,) = unfit.value.refusals
    assert (refusal.path, refusal.code) == (("glide_path", 1, "returns"), "periods_do_not_fit")


@settings(max_examples=15, deadline=None)
@given(
    st.floats(1e-3, 1 - 1e-3), st.floats(0.02, 0.4), st.sampled_from(["contribution", "initial_value", "withdrawal"])
)
def test_the_wanted_chance_is_met(wanted: float, deviation: float, solve_for: str) -> None:
    growth = log_normal(0.04, deviation)
    flows = [CashFlow(100, "year", 0, 5), CashFlow(-50 if solve_for == "initial_value" else None, "year", 5, 10)]
    if solve_for == "contribution":
        flows = [CashFlow(None, "year", 0, 5), CashFlow(-50, "year", 5, 10)]
    start = None if solve_for == "initial_value" else 200.0
    found = requirement(plan(start, flows, 10, 90, growth), solve_for, wanted)
    if found.outcome == "found" and found.value != 0:
        holds(found, wanted)


@pytest.mark.parametrize(
    ("asked", "arguments", "expected"),
    [
        (plan(), {"solve_for": "luck"}, [(("solve_for",), "unknown_choice")]),
        (plan(), {"solve_for": "target"}, [(("target",), "does_not_go_together")]),
        (plan(), {"solve_for": "contribution"}, [(("cash_flows",), "required")]),
        (
            plan(flows=[CashFlow(None, "year"), CashFlow(None, "year")]),
            {"solve_for": "withdrawal"},
            [(("cash_flows", 1, "amount"), "required")],
        ),
        (
            plan(None, [CashFlow(None, "year")], None, ()),
            {"solve_for": "initial_value"},
            [(("horizon_years",), "required"), (("target",), "required"), (("cash_flows", 0, "amount"), "required")],
        ),
        (
            plan(flows=[CashFlow(None, "year", 7)]),
            {"solve_for": "contribution"},
            [(("cash_flows", 0), "no_such_flow")],
        ),
        (plan(None), {"solve_for": "initial_value", "of": "luck"}, [(("of",), "unknown_choice")]),
        (plan(None), {"solve_for": "initial_value", "which": "luck"}, [(("which",), "unknown_choice")]),
        (
            plan(target=()),
            {"solve_for": "target", "of": "solvency"},
            [(("of",), "does_not_go_together")],
        ),
        (
            plan(None),
            {"solve_for": "initial_value", "wanted": 0.0},
            [(("wanted_success_probability",), "must_be_at_least")],
        ),
        (
            plan(None),
            {"solve_for": "initial_value", "wanted": 1.0},
            [(("wanted_success_probability",), "must_be_at_most")],
        ),
    ],
)
def test_what_does_not_fit(
    asked: Plan, arguments: dict[str, Any], expected: list[tuple[tuple[str | int, ...], str]]
) -> None:
    with pytest.raises(DoesNotFit) as unfit:
        requirement(asked, **{"wanted": 0.5, **arguments})
    assert [(refusal.path, refusal.code) for refusal in unfit.value.refusals] == expected


def test_a_shock_after_the_horizon_searched_for_does_not_count() -> None:
    shocked = plan(100, (), None, 120, log_normal(0.1, 0.05), shock=Shock(50, -0.9))
    plain = plan(100, (), None, 120, log_normal(0.1, 0.05))
    found, without = (requirement(one, "horizon_years", 0.5) for one in (shocked, plain))
    assert found.value == without.value


def test_very_large_values_are_not_rounded() -> None:
    found = requirement(plan(None, (), 5, 1e18), "initial_value", 0.5)
    assert found.outcome == "found"
    assert found.rounded == ()


def test_the_boundary_search_narrows_to_a_jump_and_bisects_where_nothing_is_told() -> None:
    tried: list[float] = []

    def step(value: float) -> float:
        tried.append(value)
        return 1.0 if value >= 3.3 else 0.0

    found = least_reaching(step, 0.5, Boundary(0.0, 0.0), 1.0)
    assert found is not None
    assert found.value == pytest.approx(3.3, rel=1e-13)
    assert len(tried) < 70
    assert least_reaching(lambda _: 0.2, 0.5, Boundary(0.0, 0.2), 1.0) is None
    # steep below and flat above: the secant creeps, so the bracket is halved
    creeping = boundary(lambda value: 0.5 + 1e-4 * (value - 1) ** 9, 0.5 + 1e-9, Boundary(5.0, 0.9), 0.0)
    assert creeping.value == pytest.approx(1 + 1e-5 ** (1 / 9), rel=1e-2)
    # a staircase: interpolation stalls, bisection goes on
    stairs = boundary(lambda value: 0.3 + 0.1 * np.floor(value), 0.55, Boundary(9.0, 1.2), 0.0)
    assert stairs.value == pytest.approx(3, rel=1e-12)
    stuck = _Search(0.5, Boundary(4.0, 0.9), 1.0)
    stuck.learn(np.log(3.0), 0.8)
    assert stuck.next() != pytest.approx(np.log(3) / 2)
    stuck.widths.extend([stuck.widths[-1]] * 3)
    assert stuck.next() == pytest.approx(np.log(3) / 2)
    assert np.isnan(interpolated([(1.0, 0.5), (2.0, 0.5)]))
    assert interpolated([(1.0, 0.5), (2.0, -0.5)]) == pytest.approx(1.5)


def test_a_value_that_rounding_would_leave_short_is_raised_a_step() -> None:
    factor = np.exp(-(0.2 + 0.4 * ndtri(0.1)))
    found = requirement(plan(None, (), 4, (100 + 6e-10) / factor, log_normal(0.05, 0.2)), "initial_value", 0.9)
    assert found.value == pytest.approx(100, abs=2e-9)
    assert [row.value for row in found.rounded] == [101, 110, 200]
