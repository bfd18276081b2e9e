"""POST /v1/rankings: rows, columns, criteria, real input, faults. Figures are tested in tests/core/portfolio."""

from typing import Any

import numpy as np
import pytest
from arch.data import nasdaq, sp500, wti

from tests.conftest import Asker

PATH = "/v1/rankings"
HOUSEHOLD: list[dict[str, Any]] = [
    {"name": name, "returns": {"model": "normal", "expected_return": mean, "volatility": volatility}}
    for name, mean, volatility in (("Cautious", 0.04, 0.06), ("Balanced", 0.06, 0.1), ("Growth", 0.08, 0.16))
]
COLUMNS = {
    "model": "normal",
    "name": ["Cautious", "Balanced", "Growth"],
    "expected_return": [0.04, 0.06, 0.08],
    "volatility": [0.06, 0.1, 0.16],
}
QUESTION = {"portfolios": HOUSEHOLD, "threshold": 0.02}


def test_columns_and_rows_say_the_same(ask: Asker) -> None:
    rows = ask.answer(PATH, QUESTION)
    columns = ask.answer(PATH, {"portfolio_columns": COLUMNS, "threshold": 0.02})
    table = columns["ranking_columns"]
    for place, row in enumerate(rows["ranking"]):
        for name in ("rank", "index", "name", "admissible", "shortfall_probability", "expected_gap", "volatility"):
            assert table[name][place] == row[name]
        assert table["tail_losses"][1]["expected_shortfall"][place] == row["tail_losses"][1]["expected_shortfall"]
    for name in ("criterion", "ranks_by_criterion", "agreement", "dominated", "summary"):
        assert rows[name] == columns[name]


@pytest.mark.parametrize(
    ("criterion", "best_first"),
    [
        ("safety_first_ratio", [1, 2, 0]),
        ("shortfall_probability", [1, 2, 0]),
        ("expected_gap", [0, 1, 2]),
        ("quantile_return", [0, 1, 2]),
        ("expected_return", [2, 1, 0]),
    ],
)
def test_all_five_criteria_rank(ask: Asker, criterion: str, best_first: list[int]) -> None:
    answer = ask.answer(PATH, QUESTION | {"criterion": criterion})
    assert answer["criterion"] == criterion
    assert [row["index"] for row in answer["ranking"]] == best_first
    assert [row["rank"] for row in answer["ranking"]] == [1, 2, 3]


def test_the_higher_distance_by_risk_is_the_safer(ask: Asker) -> None:
    # common practice, no source: with normal returns, (return - threshold)/risk orders by the chance of missing it
    answer = ask.answer(PATH, QUESTION)
    ratios = [(row["expected_return"] - 0.02) / row["volatility"] for row in answer["ranking"]]
    assert ratios == sorted(ratios, reverse=True)
    chances = [row["shortfall_probability"] for row in answer["ranking"]]
    assert chances == sorted(chances)


def test_inadmissible_portfolios_have_no_rank_and_come_last(ask: Asker) -> None:
    limits = {"shortfall_probability": 0.35}
    answer = ask.answer(PATH, QUESTION | {"criterion": "expected_return", "limits": limits})
    assert [(row["index"], row["rank"], row["admissible"]) for row in answer["ranking"]] == [
        (1, 1, True),
        (2, None, False),
        (0, None, False),
    ]
    assert {"pointer": "/ranking/1/rank", "reason": "no_rank"} in answer["null_reasons"]
    columns = ask.answer(
        PATH, {"portfolio_columns": COLUMNS, "threshold": 0.02, "criterion": "expected_return", "limits": limits}
    )
    assert columns["ranking_columns"]["rank"] == [1, None, None]
    assert {"pointer": "/ranking_columns/rank/2", "reason": "no_rank"} in columns["null_reasons"]


def test_none_admissible_is_said(ask: Asker) -> None:
    answer = ask.answer(PATH, QUESTION | {"limits": {"shortfall_probability": 0.01}})
    assert "none_admissible" in [caution["code"] for caution in answer["cautions"]]
    assert {row["rank"] for row in answer["ranking"]} == {None}


def test_names_are_echoed_unchanged_and_need_not_be_there(ask: Asker) -> None:
    name = "Été\u2028\U0001f33b <b>&\"'"
    portfolios = [
        {"name": name, "returns": HOUSEHOLD[0]["returns"]},
        {"returns": HOUSEHOLD[1]["returns"]},
        {"name": name, "returns": HOUSEHOLD[2]["returns"]},
    ]
    answer = ask.answer(PATH, {"portfolios": portfolios, "threshold": 0.02})
    assert [row["name"] for row in answer["ranking"]] == [None, name, name]
    assert "portfolio 2" in answer["summary"]


def test_sample_size_tells_how_sure_the_leader_is(ask: Asker) -> None:
    portfolios = [{"returns": each["returns"] | {"sample_size": 60}} for each in HOUSEHOLD]
    answer = ask.answer(PATH, {"portfolios": portfolios, "threshold": 0.02})
    confidence = answer["confidence_in_leader"]
    assert 0 <= confidence["at_least"] <= confidence["at_most"] <= 1
    assert [pair["index"] for pair in answer["pairwise_confidence"]] == [2, 0]
    codes = [caution["code"] for caution in answer["cautions"]]
    assert "leader_by_luck" in codes
    assert "independence_assumed" in codes
    without = ask.answer(PATH, QUESTION)
    assert without["confidence_in_leader"] is None
    assert {"pointer": "/confidence_in_leader", "reason": "needs_sample_size"} in without["null_reasons"]


def test_columns_of_one_portfolio_are_still_columns(ask: Asker) -> None:
    columns = {"model": "normal", "expected_return": 0.05, "volatility": 0.1}
    answer = ask.answer(PATH, {"portfolio_columns": columns, "threshold": 0.02, "equally_likely_outcomes": 2})
    assert answer["length"] == 1
    assert answer["ranking_columns"]["volatility"] == [0.1]
    assert len(answer["ranking_columns"]["outcomes"]) == 2


def test_correlations_are_taken_with_rows_and_with_columns(ask: Asker) -> None:
    correlations = [[1, 0.8, 0.5], [0.8, 1, 0.9], [0.5, 0.9, 1]]
    columns = ask.answer(
        PATH, {"portfolio_columns": COLUMNS | {"sample_size": 60}, "threshold": 0.02, "correlations": correlations}
    )
    portfolios = [each | {"returns": each["returns"] | {"sample_size": 60}} for each in HOUSEHOLD]
    rows = ask.answer(PATH, {"portfolios": portfolios, "threshold": 0.02, "correlations": correlations})
    assert columns["confidence_in_leader"] == rows["confidence_in_leader"]
    assert "independence_assumed" not in [caution["code"] for caution in rows["cautions"]]


def test_equal_laws_are_counted_once(ask: Asker) -> None:
    returns = [{"model": "normal", "expected_return": 0.05 + 1e-5 * i, "volatility": 0.1} for i in range(600)]
    many = {"portfolios": [{"returns": each} for each in returns], "threshold": 0.02, "horizon_years": 10}
    assert ask.faults(PATH, many) == {"": "too_much_work"}
    same = {"portfolios": [{"returns": returns[0]}] * 600, "threshold": 0.02, "horizon_years": 10}
    assert len(ask.answer(PATH, same)["ranking"]) == 600


def test_ten_thousand_portfolios_from_columns(ask: Asker) -> None:
    count = 10_000
    columns = {"model": "normal", "expected_return": np.linspace(0.0, 0.1, count).tolist(), "volatility": 0.1}
    answer = ask.answer(PATH, {"portfolio_columns": columns, "threshold": 0.02})
    assert answer["ranking_columns"]["index"] == list(range(count - 1, -1, -1))
    assert answer["dominated"] is None
    assert {"pointer": "/dominated", "reason": "not_computed"} in answer["null_reasons"]


def daily_returns() -> dict[str, np.ndarray[Any, np.dtype[np.float64]]]:
    """Daily simple returns of three series that the package arch ships (NCSA licence): S&P 500, NASDAQ, WTI oil."""
    prices = {
        "sp500": sp500.load()["Adj Close"],
        "nasdaq": nasdaq.load()["Adj Close"],
        "wti": wti.load()["DCOILWTICO"].dropna(),
    }
    return {name: np.diff(series.to_numpy()) / series.to_numpy()[:-1] for name, series in prices.items()}


def test_daily_returns_of_three_indices_are_ranked_by_what_counting_gives(ask: Asker) -> None:
    returns, floor = daily_returns(), -0.01
    assert [len(series) for series in returns.values()] == [5030, 5030, 8320]
    portfolios = [
        {"name": name, "returns": {"model": "empirical", "period": "day", "observations": series.tolist()}}
        for name, series in returns.items()
    ]
    question = {
        "portfolios": portfolios,
        "threshold": floor,
        "threshold_basis": "over_horizon",
        "horizon_years": 1 / 252,
        "criterion": "shortfall_probability",
    }
    answer = ask.answer(PATH, question)
    counted = {name: float(np.mean(series < floor)) for name, series in returns.items()}
    assert [row["name"] for row in answer["ranking"]] == sorted(counted, key=lambda name: counted[name])
    for row in answer["ranking"]:
        series = returns[row["name"]]
        assert row["shortfall_probability"] == pytest.approx(counted[row["name"]], abs=1e-15)
        often = row["frequencies"]["shortfall_probability"]
        assert often["count"] / often["out_of"] == pytest.approx(counted[row["name"]], rel=0.1)
        assert row["expected_return"] == pytest.approx(series.mean(), rel=1e-12)
        assert row["volatility"] == pytest.approx(series.std(), rel=1e-12)
        assert row["expected_gap"] == pytest.approx(np.maximum(floor - series, 0).mean(), rel=1e-12)


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({"threshold": 0}, {"": "required"}),
        (
            {"portfolios": HOUSEHOLD, "portfolio_columns": COLUMNS, "threshold": 0},
            {"/portfolio_columns": "does_not_go_together"},
        ),
        ({"portfolios": HOUSEHOLD}, {"/threshold": "required"}),
        ({"portfolios": [], "threshold": 0}, {"/portfolios": "empty"}),
        ({"portfolios": {}, "threshold": 0}, {"/portfolios": "not_an_array"}),
        (QUESTION | {"threshold": [0, 1]}, {"/threshold": "no_arrays"}),
        (QUESTION | {"criterion": "sharpest"}, {"/criterion": "unknown_choice"}),
        (QUESTION | {"limits": {"shortfal_probability": 0.1}}, {"/limits/shortfal_probability": "unknown_field"}),
        (QUESTION | {"limits": {"shortfall_probability": 2}}, {"/limits/shortfall_probability": "must_be_at_most"}),
        (QUESTION | {"limits": 1}, {"/limits": "not_an_object"}),
        (QUESTION | {"correlations": [[1, 0], [0, 1]]}, {"/correlations": "lengths_differ"}),
        (QUESTION | {"correlations": [[1, 0, 0], [0, 1], [0, 0, 1]]}, {"/correlations/1": "lengths_differ"}),
        (QUESTION | {"correlations": [[1, 2, 0], [2, 1, 0], [0, 0, 1]]}, {"/correlations": "not_a_correlation_matrix"}),
        (QUESTION | {"correlations": 1}, {"/correlations": "not_an_array"}),
        (
            {
                "portfolios": [
                    HOUSEHOLD[0],
                    {"returns": {"model": "normal", "expected_return": "a", "volatility": 1}},
                    7,
                ],
                "threshold": 0,
            },
            {"/portfolios/1/returns/expected_return": "not_a_number", "/portfolios/2": "not_an_object"},
        ),
        (
            {"portfolios": [HOUSEHOLD[0], {"returns": {"model": "empirical", "observations": [-2]}}], "threshold": 0},
            {"/portfolios/1/returns/observations/0": "must_be_at_least"},
        ),
        (
            {"portfolio_columns": COLUMNS | {"volatility": [0.1, 0.2]}, "threshold": 0},
            {"/portfolio_columns/volatility": "lengths_differ"},
        ),
        (
            {"portfolio_columns": COLUMNS | {"name": ["a"]}, "threshold": 0},
            {"/portfolio_columns/name": "lengths_differ"},
        ),
        (
            {"portfolio_columns": COLUMNS | {"name": ["a", 1, None]}, "threshold": 0},
            {"/portfolio_columns/name/1": "not_text"},
        ),
        (
            {"portfolio_columns": {"model": "empirical", "observations": [1]}, "threshold": 0},
            {"/portfolio_columns/model": "unknown_model"},
        ),
        (QUESTION | {"questions": []}, {"/questions": "unknown_field"}),
        (QUESTION | {"horizon_years": 2.5}, {"/horizon_years": "horizon_not_divisible"}),
    ],
)
def test_what_does_not_fit_is_named_by_pointer_and_code(ask: Asker, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(PATH, question) == expected
