"""Rankings: order, ties, limits, cautions, and what does not depend on how the portfolios are sent."""

import time
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.core.errors import DoesNotFit
from service.core.portfolio import CRITERIA
from service.core.returns import Returns
from tests.core.portfolio.build import floor, normal, ranking
from tests.core.portfolio.strategies import any_returns
from tests.core.returns.build import returns

THREE = [normal(0.04, 0.06), normal(0.06, 0.1), normal(0.08, 0.16)]
CALM: dict[str, Any] = {"model": "lognormal", "expected_return": 0.06, "volatility": 0.12}
BOLD: dict[str, Any] = {"model": "lognormal", "expected_return": 0.08, "volatility": 0.16}
HEAVY: dict[str, Any] = {
    "model": "student_t",
    "compounding": "continuous",
    "expected_return": 0.05,
    "volatility": 0.1,
    "degrees_of_freedom": 4,
}


def codes(found: Any) -> list[str]:
    return [caution.code for caution in found.cautions]


@pytest.mark.parametrize(
    ("criterion", "order"),
    [
        ("safety_first_ratio", [1, 2, 0]),
        ("shortfall_probability", [1, 2, 0]),
        ("expected_gap", [0, 1, 2]),
        ("quantile_return", [0, 1, 2]),
        ("expected_return", [2, 1, 0]),
    ],
)
def test_each_criterion_has_its_own_order(criterion: str, order: list[int]) -> None:
    found = ranking(THREE, criterion=criterion)
    assert found.order.tolist() == order
    assert found.ranks[found.order].tolist() == [1, 2, 3]


def test_the_criteria_say_who_proposed_them_and_which_way_is_better() -> None:
    assert {name: (c.better, c.source) for name, c in CRITERIA.items()} == {
        "safety_first_ratio": ("higher", "Roy 1952"),
        "shortfall_probability": ("lower", "Roy 1952"),
        "expected_gap": ("lower", "Fishburn 1977"),
        "quantile_return": ("higher", "Kataoka 1963"),
        "expected_return": ("higher", "Telser 1955"),
    }
    assert all(c.name == name and c.meaning for name, c in CRITERIA.items())


def test_under_a_limit_the_inadmissible_come_last_by_their_chance_and_without_a_rank() -> None:
    found = ranking([*THREE, normal(0.09, 0.4)], criterion="expected_return", limit=0.36)
    assert found.admissible.tolist() == [False, True, True, False]
    assert found.order.tolist() == [2, 1, 0, 3]
    assert found.ranks.tolist() == [0, 2, 1, 0]
    assert found.ranks_by_criterion["expected_return"].tolist() == [4, 3, 2, 1]


def test_a_limit_met_to_the_last_digit_is_met() -> None:
    chance = float(ranking([normal(0.06, 0.1)]).shortfall.shortfall_probability[0])
    assert ranking([normal(0.06, 0.1)], limit=chance - 5e-13).admissible.all()
    assert not ranking([normal(0.06, 0.1)], limit=chance - 5e-12).admissible.any()


def test_none_admissible_is_said() -> None:
    found = ranking([normal(m, v, sample_size=60) for m, v in ((0.04, 0.06), (0.06, 0.1))], limit=0.1)
    assert found.ranks.tolist() == [0, 0]
    assert codes(found) == ["none_admissible"]
    assert found.confidence_in_leader is None
    assert found.confidence_reason == "none_admissible"


def test_infinite_ratios_lead_and_missing_ones_follow_without_a_rank() -> None:
    found = ranking([THREE[0], normal(0.03, 0), normal(0.02, 0), normal(0.01, 0), returns(**HEAVY)])
    assert found.order.tolist() == [1, 0, 3, 2, 4]
    assert found.ranks.tolist() == [2, 1, 0, 3, 0]


def test_an_infinite_expected_return_has_no_rank() -> None:
    found = ranking([returns(**HEAVY), THREE[0]], criterion="expected_return")
    assert found.order.tolist() == [1, 0]
    assert found.ranks.tolist() == [0, 1]


def test_copies_are_tied() -> None:
    found = ranking([THREE[1], THREE[0], THREE[1]])
    assert found.ranks.tolist() == [1, 3, 1]
    assert found.order.tolist() == [0, 2, 1]


def test_ratio_and_probability_may_disagree_over_long_horizons() -> None:
    found = ranking([returns(**CALM), returns(**BOLD)], floor=floor(0.02, 30))
    assert found.order.tolist() == [0, 1]
    (caution,) = (c for c in found.cautions if c.code == "ratio_and_probability_disagree")
    assert caution.params == {"pairs": [[0, 1]], "pairs_total": 1}
    assert "ratio_and_probability_disagree" not in codes(ranking([returns(**CALM), returns(**BOLD)]))


def test_disagreement_among_thousands_is_noticed() -> None:
    count = 1_500
    means, spreads = np.linspace(0.05, 0.08, count).tolist(), np.linspace(0.1, 0.16, count).tolist()
    found = ranking(returns("lognormal", expected_return=means, volatility=spreads), floor=floor(0.02, 30))
    (caution,) = (c for c in found.cautions if c.code == "ratio_and_probability_disagree")
    assert len(caution.params["pairs"]) == 100
    assert caution.params["pairs_total"] is None


def test_nothing_is_compared_pair_by_pair_beyond_a_thousand() -> None:
    many = returns("normal", expected_return=[0.05] * 1_001, volatility=[0.1] * 1_001, sample_size=60)
    found = ranking(many)
    assert (found.agreement, found.dominated, found.pairwise_confidence) == (None, None, None)
    assert found.confidence_in_leader is not None
    assert ranking(returns("normal", expected_return=[0.05] * 1_000, volatility=[0.1] * 1_000)).dominated == ()


@settings(max_examples=60, deadline=None)
@given(st.lists(any_returns(), min_size=1, max_size=7), st.randoms(), st.sampled_from(sorted(CRITERIA)))
def test_the_order_of_the_question_does_not_matter(rows: list[Returns], random: Any, criterion: str) -> None:
    shuffled = list(range(len(rows)))
    random.shuffle(shuffled)
    first = ranking(rows, criterion=criterion, limit=0.5)
    again = ranking([rows[i] for i in shuffled], criterion=criterion, limit=0.5)
    assert again.ranks.tolist() == [first.ranks[i] for i in shuffled]
    assert again.admissible.tolist() == [first.admissible[i] for i in shuffled]


@settings(max_examples=40, deadline=None)
@given(st.lists(any_returns(), min_size=1, max_size=6))
def test_a_portfolio_has_the_same_figures_alone_and_among_others(rows: list[Returns]) -> None:
    together = ranking(rows, confidence_levels=[0.95], outcomes_count=3).shortfall
    for i, row in enumerate(rows):
        alone = ranking([row], confidence_levels=[0.95], outcomes_count=3).shortfall
        for name in ("shortfall_probability", "expected_gap", "safety_first_ratio", "log_safety_first_ratio"):
            value = float(getattr(alone, name)[0])
            assert float(getattr(together, name)[i]) == pytest.approx(value, rel=1e-12, abs=1e-15, nan_ok=True)
        assert together.tail_losses[0].expected_shortfall[i] == pytest.approx(
            float(alone.tail_losses[0].expected_shortfall[0]), rel=1e-11, abs=1e-14, nan_ok=True
        )
        assert together.outcomes is not None
        assert alone.outcomes is not None
        assert together.outcomes[:, i].tolist() == pytest.approx(alone.outcomes[:, 0].tolist(), rel=1e-12, abs=1e-14)
        assert [float(m[i]) for m in together.actual_moments] == pytest.approx(
            [float(m[0]) for m in alone.actual_moments], nan_ok=True
        )


def test_rows_and_columns_are_one_question() -> None:
    columns = returns("student_t", expected_return=[0.04, 0.06], volatility=[0.06, 0.1], degrees_of_freedom=5)
    rows = [
        returns("student_t", expected_return=m, volatility=v, degrees_of_freedom=5)
        for m, v in ((0.04, 0.06), (0.06, 0.1))
    ]
    by_columns, by_rows = ranking(columns), ranking(rows)
    assert by_columns.order.tolist() == by_rows.order.tolist()
    assert by_columns.shortfall.expected_gap.tolist() == pytest.approx(by_rows.shortfall.expected_gap.tolist())


def test_a_sample_in_columns_is_one_portfolio() -> None:
    found = ranking(returns("empirical", observations=[-0.1, 0.05, 0.2]))
    assert found.order.tolist() == [0]
    assert found.shortfall.shortfall_probability.tolist() == pytest.approx([1 / 3])


def test_models_side_by_side_say_that_several_methods_were_used() -> None:
    found = ranking([THREE[0], returns("empirical", observations=[0.1, -0.1])])
    assert found.shortfall.method == "several_methods"
    assert found.shortfall.numerical_error == 1e-14
    assert found.shortfall.numerical_error_kind == "bound"


def test_uncertain_estimates_count_for_every_portfolio() -> None:
    rows = [normal(0.06, 0.1, sample_size=n) for n in (10, 1_000)]
    found = ranking(rows, floor=floor(-0.2), parameter_uncertainty="predictive").shortfall.shortfall_probability
    assert found[0] > 2 * found[1]


def test_refusals_lead_to_the_first_portfolio_of_their_kind() -> None:
    rows = [returns("empirical", observations=[0.1]), normal(0.06, 0.1, sample_size=3), returns(**CALM, sample_size=2)]
    with pytest.raises(DoesNotFit) as raised:
        ranking(rows, parameter_uncertainty="predictive")
    assert [(r.path, r.code) for r in raised.value.refusals] == [
        (("parameter_uncertainty",), "predictive_not_available"),
        (("portfolios", 1, "returns", "sample_size"), "must_be_at_least"),
        (("portfolios", 2, "returns", "sample_size"), "must_be_at_least"),
    ]
    alike = [normal(0.06, 0.1, sample_size=n) for n in (30, 4, 3)]
    with pytest.raises(DoesNotFit) as raised:
        ranking([rows[0], *alike], parameter_uncertainty="predictive")
    assert raised.value.refusals[1].path == ("portfolios", 3, "returns", "sample_size")
    with pytest.raises(DoesNotFit) as raised:
        ranking(returns("normal", expected_return=[0.1], volatility=[0.1]), parameter_uncertainty="predictive")
    assert raised.value.refusals[0].path == ("portfolio_columns", "sample_size")


def test_ten_thousand_portfolios_take_a_moment() -> None:
    """Measured at 15 ms; the limit leaves room for a busy machine."""
    random = np.random.default_rng(1)
    many = returns(
        "normal",
        expected_return=random.normal(0.06, 0.03, 10_000).tolist(),
        volatility=random.uniform(0.02, 0.3, 10_000).tolist(),
    )
    times = []
    for _ in range(3):
        start = time.perf_counter()
        found = ranking(many, confidence_levels=[0.95, 0.99])
        times.append(time.perf_counter() - start)
    assert min(times) < 0.2
    assert sorted(found.order.tolist()) == list(range(10_000))
