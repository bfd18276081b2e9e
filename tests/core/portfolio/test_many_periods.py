"""Portfolios over several periods: what stands beside their figures, and how they are compared."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.errors import DoesNotFit
from service.core.portfolio.collection import Portfolios, collected
from service.core.returns import Returns
from tests.core.portfolio.build import figures, floor, normal, ranking
from tests.core.returns.build import returns

MIXED: dict[str, Any] = {
    "components": [
        {"weight": 0.9, "expected_return": 0.08, "volatility": 0.1},
        {"weight": 0.1, "expected_return": -0.1, "volatility": 0.3},
    ]
}


def sample(*observations: float, **more: Any) -> Returns:
    return returns("empirical", observations=list(observations), **more)


def many_values(shift: float = 0.0) -> Returns:
    return sample(*(np.random.default_rng(1).normal(0.05 + shift, 0.1, 60)))


def test_total_losses_that_are_final_are_said() -> None:
    assert figures(normal(0.06, 0.5), 0.0, horizon_years=3).cautions == ("growth_below_zero",)
    assert figures(normal(0.06, 0.5), 0.0).cautions == ()
    assert figures(normal(0.06, 0.1), 0.0, horizon_years=3).cautions == ()
    assert figures(sample(-1, 0.5), 0.0, horizon_years=3).cautions == ("growth_below_zero",)


def test_a_law_too_rich_to_list_is_said_to_be_approximated() -> None:
    found = figures(many_values(), 0.0, horizon_years=12)
    assert found.cautions == ("discrete_law_approximated",)
    assert found.method == "fourier_inversion"
    assert found.numerical_error_kind == "estimate"
    codes = [caution.code for caution in ranking([many_values(), normal(0.06, 0.5)], floor=floor(0.0, 12)).cautions]
    assert {"discrete_law_approximated", "growth_below_zero"} <= set(codes)


def test_more_risk_for_twice_the_return_is_the_safer_portfolio_after_thirty_years() -> None:
    """6 % with a volatility of 12 % against 8 % with 16 %: the ratio says one, the chance of a miss the other."""
    calm = returns("lognormal", expected_return=0.06, volatility=0.12)
    bold = returns("lognormal", expected_return=0.08, volatility=0.16)
    found = ranking([calm, bold], floor=floor(0.02, 30))
    assert found.ranks.tolist() == [1, 2]
    assert found.ranks_by_criterion["shortfall_probability"].tolist() == [2, 1]
    assert found.shortfall.shortfall_probability == pytest.approx([0.0596193106879445, 0.0426053838265383], rel=1e-13)
    assert "ratio_and_probability_disagree" in [caution.code for caution in found.cautions]


def test_equal_rows_are_computed_once() -> None:
    rows = [
        returns("normal_mixture", **MIXED),
        normal(0.05, 0.1),
        returns("normal_mixture", **MIXED),
        normal(0.05, 0.1),
        normal(0.06, 0.1),
    ]
    law = collected(Portfolios(rows), 3, "ignored").law
    assert sorted(positions.tolist() for _, positions in law.parts) == [[0, 2], [1, 3], [4]]
    below = law.probability_below(number(0.02))
    assert below[0] == below[2]
    assert below[1] == below[3] != below[4]
    other_periods = [returns("normal_mixture", **MIXED), returns("normal_mixture", **MIXED, period="month")]
    assert len(collected(Portfolios(other_periods), 1, "ignored").law.parts) == 2


def test_columns_over_several_periods() -> None:
    columns = returns("normal", expected_return=[0.05, 0.06, 0.05], volatility=[0.1, 0.1, 0.1])
    found = ranking(columns, floor=floor(0.02, 3))
    assert found.ranks.tolist() == [2, 1, 2]
    alone = figures(normal(0.06, 0.1), 0.02, horizon_years=3)
    assert found.shortfall.shortfall_probability[1] == alone.shortfall_probability
    assert found.shortfall.actual_moments.mean.tolist() == [0.05, 0.06, 0.05]


def test_rows_that_take_too_long_together_are_refused() -> None:
    rows = [many_values(shift / 1000) for shift in range(130)]
    with pytest.raises(DoesNotFit) as raised:
        ranking(rows, floor=floor(0.0, 12))
    assert {refusal.code for refusal in raised.value.refusals} == {"too_much_work"}


def test_dominance_over_several_periods_is_numerical() -> None:
    found = ranking([normal(0.07, 0.1), normal(0.05, 0.1)], floor=floor(0.02, 3))
    assert found.dominated is not None
    (one,) = found.dominated
    assert (one.index, one.by_index, one.order, one.basis) == (1, 0, 1, "numerical")


def test_dominance_between_listed_laws_of_many_periods_is_exact() -> None:
    found = ranking([sample(-0.1, 0.2), sample(-0.2, 0.1)], floor=floor(0.0, 5))
    assert found.dominated is not None
    assert [(one.index, one.order, one.basis) for one in found.dominated] == [(1, 1, "exact")]


def test_laws_with_too_many_values_to_compare_are_compared_from_each_probability_to_the_next() -> None:
    better, worse = many_values(0.03), many_values()
    found = ranking([better, worse], floor=floor(0.0, 3))
    assert found.dominated is not None
    assert [(one.index, one.basis) for one in found.dominated] == [(1, "numerical")]


def test_moves_in_columns_are_ranked() -> None:
    columns = returns(
        "up_down", up_return=[0.1, 0.1], down_return=[-0.1, -0.05], up_probability=[0.5, 0.5], moves=[4, 4]
    )
    found = ranking(columns, floor=floor(0.0, 2))
    assert found.ranks.tolist() == [2, 1]
    assert found.shortfall.method == "enumeration"
