"""The conventions of a plan: when flows come, how they grow, and what is refused."""

from typing import Any

import numpy as np
import pytest

from service.core.errors import DoesNotFit
from service.core.goals import CashFlow, GompertzLife, Leg, Lifetime, Plan, Shock, TableLife, outlook
from service.core.goals.timeline import timeline
from service.core.goals.work import MOST_WORK, Work
from tests.core.goals.build import log_normal, plan, returns


def faults(make: Any) -> list[tuple[tuple[str | int, ...], str]]:
    with pytest.raises(DoesNotFit) as unfit:
        make()
    return [(refusal.path, refusal.code) for refusal in unfit.value.refusals]


@pytest.mark.parametrize(
    ("flow", "horizon", "times"),
    [
        (CashFlow(1, "year"), 3, [0, 1, 2]),
        (CashFlow(1, "year", timing="end"), 3, [1, 2, 3]),
        (CashFlow(1, "year", 0.5), 3, [0.5, 1.5, 2.5]),
        (CashFlow(1, "year", 0.5, timing="end"), 3, [1.5, 2.5]),
        (CashFlow(1, "year", 1, 2.5), 9, [1, 2]),
        (CashFlow(1, "year", 1, 2.5, timing="end"), 9, [2]),
        (CashFlow(1, "quarter", 0, 1), 9, [0, 0.25, 0.5, 0.75]),
        (CashFlow(1, "month", 2, 2 + 1 / 12), 9, [2]),
        (CashFlow(1, "once"), 3, [0]),
        (CashFlow(1, "once", 3), 3, []),
        (CashFlow(1, "month", 5), 3, []),
    ],
)
def test_when_a_flow_comes(flow: CashFlow, horizon: float, times: list[float]) -> None:
    assert flow.times(horizon) == pytest.approx(np.array(times))


def test_flows_grow_by_whole_years_since_the_start() -> None:
    growth = CashFlow(1, "month", 0.5, yearly_growth=0.1).growth(3)
    assert growth == pytest.approx(np.repeat([1, 1.1, 1.1**2], [6, 12, 12]))
    # 12 months of 1/12 are a year, whatever their floats add up to
    months = CashFlow(1, "month", yearly_growth=1.0).growth(60)
    assert months == pytest.approx(2.0 ** (np.arange(720) // 12))


def test_flows_of_one_time_add_up_before_anything_is_judged() -> None:
    flows = [CashFlow(-100, "year", 1), CashFlow(100, "month", 0, 2)]
    figures = outlook(plan(0, flows, 2, 0, log_normal(0.0, 0.2)))
    assert figures.depletion_probability == 0
    laid = timeline(plan(0, flows, 2))
    assert laid.flows[laid.position(1)] == 0
    assert laid.lengths == pytest.approx(np.full(24, 1 / 12))
    assert len(set(laid.lengths.tolist())) == 1


def test_the_years_shown_end_with_the_horizon() -> None:
    assert outlook(plan(horizon=2.5)).by_year.year == pytest.approx([0, 1, 2, 2.5])
    assert outlook(plan(horizon=3)).by_year.year == pytest.approx([0, 1, 2, 3])
    two_years = returns("normal", expected_return=0.1, volatility=0.2, periods_per_year=0.5)
    assert outlook(plan(horizon=4, growth=two_years)).by_year.year == pytest.approx([0, 2, 4])


def test_a_single_normal_law_may_be_asked_at_any_time() -> None:
    monthly = outlook(plan(100, [CashFlow(10, "month")], 2, 300, log_normal(0.05, 0.2)))
    weekly = log_normal(0.05 / 52, 0.2 / np.sqrt(52), period="week")
    assert outlook(plan(100, [CashFlow(10, "month")], 2, 300, weekly)).success_probability == pytest.approx(
        monthly.success_probability, abs=1e-11
    )


NORMAL = returns("normal", expected_return=0.05, volatility=0.1)


@pytest.mark.parametrize(
    ("given", "path"),
    [
        ({"flows": [CashFlow(1, "month")]}, ("cash_flows", 0, "every")),
        ({"horizon": 2.5}, ("horizon_years",)),
        ({"growth": (Leg(1.5, NORMAL), Leg(5.0, NORMAL))}, ("glide_path", 0, "until_year")),
        ({"shock": Shock(1.5, -0.1)}, ("shock", "at_year")),
    ],
)
def test_times_within_a_period_are_refused_where_the_law_does_not_divide(
    given: dict[str, Any], path: tuple[str | int, ...]
) -> None:
    given = {"growth": NORMAL, **given}
    assert faults(lambda: outlook(plan(**given))) == [(path, "periods_do_not_fit")]


def test_legs_of_different_periods_must_each_fit() -> None:
    three = returns("normal", expected_return=0.05, volatility=0.1, periods_per_year=1 / 3)
    legs = (Leg(1.0, NORMAL), Leg(6.0, three))
    path = ("glide_path", 0, "until_year")
    assert faults(lambda: outlook(plan(horizon=6, growth=legs))) == [(path, "periods_do_not_fit")]


GOOD_LIFE = GompertzLife(65, 88, 10)


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        ({"initial_value": -1.0}, [(("initial_value",), "must_not_be_negative")]),
        ({"horizon": 0.0}, [(("horizon_years",), "must_be_positive")]),
        ({"target": -1.0}, [(("target",), "must_not_be_negative")]),
        ({"target": (1.0, -1.0)}, [(("targets", 1), "must_not_be_negative")]),
        ({"inflation_rate": -1.0}, [(("inflation_rate",), "must_be_above")]),
        ({"yearly_fee": -0.1}, [(("yearly_fee",), "must_not_be_negative")]),
        ({"yearly_fee": 1.0}, [(("yearly_fee",), "must_be_below")]),
        ({"flows": [CashFlow(1, "day")]}, [(("cash_flows", 0, "every"), "unknown_choice")]),
        ({"flows": [CashFlow(1, "year", timing="mid")]}, [(("cash_flows", 0, "timing"), "unknown_choice")]),
        ({"flows": [CashFlow(1, "year", -1)]}, [(("cash_flows", 0, "from_year"), "must_not_be_negative")]),
        ({"flows": [CashFlow(1, "year", 2, 2)]}, [(("cash_flows", 0, "to_year"), "out_of_order")]),
        ({"flows": [CashFlow(1, "year", yearly_growth=-1)]}, [(("cash_flows", 0, "yearly_growth"), "must_be_above")]),
        ({"flows": [CashFlow(1, "once", 0, 2)]}, [(("cash_flows", 0, "to_year"), "does_not_go_together")]),
        ({"flows": [CashFlow(1, "once", timing="end")]}, [(("cash_flows", 0, "timing"), "does_not_go_together")]),
        (
            {"growth": (Leg(2.0, NORMAL), Leg(1.0, NORMAL), Leg(9.0, NORMAL))},
            [(("glide_path", 1, "until_year"), "out_of_order")],
        ),
        ({"growth": (Leg(2.0, NORMAL), Leg(4.0, NORMAL))}, [(("glide_path", 1, "until_year"), "must_be_at_least")]),
        ({"shock": Shock(-1, 0)}, [(("shock", "at_year"), "must_not_be_negative")]),
        ({"shock": Shock(5, 0)}, [(("shock", "at_year"), "must_be_below")]),
        ({"shock": Shock(1, -1)}, [(("shock", "return"), "must_be_above")]),
        ({"parameter_uncertainty": "maybe"}, [(("parameter_uncertainty",), "unknown_choice")]),
        ({"parameter_uncertainty": "predictive"}, [(("returns", "sample_size"), "required")]),
        (
            {"parameter_uncertainty": "predictive", "growth": log_normal(0.1, 0.1, sample_size=1)},
            [(("returns", "sample_size"), "must_be_at_least")],
        ),
        (
            {"parameter_uncertainty": "predictive", "growth": returns("empirical", observations=[0.1, 0.2])},
            [(("parameter_uncertainty",), "predictive_not_available")],
        ),
        (
            {"lifetime": Lifetime((GompertzLife(-1, 0, 0),))},
            [
                (("lifetime", "age"), "must_not_be_negative"),
                (("lifetime", "modal_age"), "must_be_positive"),
                (("lifetime", "dispersion"), "must_be_positive"),
            ],
        ),
        (
            {"lifetime": Lifetime((GOOD_LIFE, TableLife((1.5, -0.5))))},
            [
                (("lives", 1, "yearly_survival", 1), "must_not_be_negative"),
                (("lives", 1, "yearly_survival", 0), "must_be_at_most"),
                (("lives", 1, "yearly_survival"), "too_few"),
            ],
        ),
        ({"horizon": 4000.0, "flows": [CashFlow(1, "month")]}, [(("horizon_years",), "too_much_work")]),
    ],
)
def test_what_does_not_fit(given: dict[str, Any], expected: list[tuple[tuple[str | int, ...], str]]) -> None:
    assert faults(lambda: plan(**given)) == expected


def test_every_open_field_is_named() -> None:
    open_plan = Plan(None, (CashFlow(None, "year"),), None, (), (Leg(None, NORMAL),))
    paths = [("initial_value",), ("horizon_years",), ("target",), ("cash_flows", 0, "amount")]
    assert faults(lambda: outlook(open_plan)) == [(path, "required") for path in paths]


def test_growth_beyond_the_doubles_is_refused() -> None:
    flow = CashFlow(1e300, "year", yearly_growth=1e6)
    assert faults(lambda: outlook(plan(flows=[flow]))) == [(("cash_flows", 0, "yearly_growth"), "not_representable")]


def test_lives_that_fit_have_no_refusals_before_the_horizon_is_known() -> None:
    assert plan(horizon=None, lifetime=Lifetime((TableLife((0.9,)),)), shock=Shock(3, -0.1)).horizon_years is None


def test_survival_by_gompertz_and_by_table() -> None:
    years = np.array([0.0, 0.5, 1.0, 10.0, 1000.0])
    alive = GompertzLife(65, 88, 10).survival(years)
    assert alive == pytest.approx(np.exp(np.exp(-2.3) * (1 - np.exp(years / 10))))
    assert GompertzLife(0, 1e6, 0.1).survival(years) == pytest.approx(np.ones(5))
    table = TableLife((0.9, 0.5, 0.0))
    assert table.survival(np.array([0, 0.5, 1, 1.5, 2, 3])) == pytest.approx(
        [1, 0.9**0.5, 0.9, 0.9 * 0.5**0.5, 0.45, 0]
    )
    both = Lifetime((table, table)).survival(np.array([1.0]))
    assert both == pytest.approx([1 - 0.1**2])


def test_work_beyond_the_limit_is_refused_with_both_figures() -> None:
    work = Work(MOST_WORK)
    with pytest.raises(DoesNotFit) as unfit:
        work.step()
    (refusal,) = unfit.value.refusals
    assert refusal.code == "too_much_work"
    assert refusal.params["work"] > refusal.params["limit"]
    # a volatility that falls to nearly nothing needs ever more points
    legs = (Leg(15.0, log_normal(0.05, 0.5)), Leg(30.0, log_normal(0.0, 1e-6)))
    assert faults(lambda: outlook(plan(1e5, [CashFlow(-500, "month")], 30, 1e4, legs))) == [
        (("horizon_years",), "too_much_work")
    ]
