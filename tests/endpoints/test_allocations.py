"""POST /v1/allocations, and portfolios by weights in shortfalls and rankings."""

from typing import Any

import pytest

from tests.conftest import Asker

PATH = "/v1/allocations"
ASSETS: dict[str, Any] = {
    "names": ["Bonds", "Shares", "Property"],
    "expected_returns": [0.02, 0.07, 0.05],
    "volatilities": [0.05, 0.18, 0.12],
    "correlations": [[1, 0.1, 0.2], [0.1, 1, 0.6], [0.2, 0.6, 1]],
}
QUESTION: dict[str, Any] = {"assets": ASSETS, "threshold": 0, "objective": "safety_first_ratio"}
MIXES = [
    {"name": "Calm", "weights": [{"asset": "Bonds", "weight": 0.8}, {"asset": "Shares", "weight": 0.2}]},
    {"name": "Brisk", "weights": [{"asset": "Shares", "weight": 0.7}, {"asset": "Property", "weight": 0.3}]},
]


def test_the_best_mix_with_its_figures(ask: Asker) -> None:
    answer = ask.answer(PATH, QUESTION)
    assert answer["objective"] == "safety_first_ratio"
    assert [row["asset"] for row in answer["weights"]] == ASSETS["names"]
    assert sum(row["weight"] for row in answer["weights"]) == pytest.approx(1)
    assert answer["kkt_violation"] < 1e-13
    # the same mix as a portfolio has the same figures
    alone = ask.answer(
        "/v1/shortfalls", {"portfolio": {"weights": answer["weights"]}, "assets": ASSETS, "threshold": 0}
    )
    for name in ("shortfall_probability", "expected_return", "volatility", "safety_first_ratio", "expected_gap"):
        assert answer[name] == pytest.approx(alone[name], rel=1e-12)
    assert "optimum_is_optimistic" in [caution["code"] for caution in answer["cautions"]]


def test_no_listed_mix_is_safer_than_the_best(ask: Asker) -> None:
    best = ask.answer(PATH, QUESTION)["safety_first_ratio"]
    ranking = ask.answer("/v1/rankings", {"portfolios": MIXES, "assets": ASSETS, "threshold": 0})["ranking"]
    assert all(row["safety_first_ratio"] <= best for row in ranking)


def test_monthly_assets_are_asked_for_a_month(ask: Asker) -> None:
    monthly = ASSETS | {
        "expected_returns": [0.002, 0.006, 0.004],
        "volatilities": [0.015, 0.05, 0.035],
        "period": "month",
    }
    answer = ask.answer(PATH, {"assets": monthly, "threshold": 0.01, "objective": "quantile_return"})
    assert answer["threshold_at_probability"]["threshold"] < 0
    assert "longer_is_not_safer" not in [caution["code"] for caution in answer["cautions"]]


def test_correlations_of_mixes_are_known(ask: Asker) -> None:
    answer = ask.answer("/v1/rankings", {"portfolios": MIXES, "assets": ASSETS | {"sample_size": 60}, "threshold": 0})
    codes = [caution["code"] for caution in answer["cautions"]]
    assert "leader_by_luck" in codes
    assert "independence_assumed" not in codes
    mixed = [MIXES[0], {"returns": {"model": "normal", "expected_return": 0.05, "volatility": 0.1, "sample_size": 60}}]
    answer = ask.answer("/v1/rankings", {"portfolios": mixed, "assets": ASSETS | {"sample_size": 60}, "threshold": 0})
    assert "independence_assumed" in [caution["code"] for caution in answer["cautions"]]


def test_a_lognormal_mix_says_that_its_law_is_fitted(ask: Asker) -> None:
    question = {"portfolios": MIXES, "assets": ASSETS | {"model": "lognormal"}, "threshold": 0}
    found = [c for c in ask.answer("/v1/rankings", question)["cautions"] if c["code"] == "law_is_approximation"]
    assert [caution["pointer"] for caution in found] == ["/assets/model"]


@pytest.mark.parametrize(
    ("path", "question", "expected"),
    [
        (PATH, {}, {"/assets": "required", "/threshold": "required", "/objective": "required"}),
        (PATH, QUESTION | {"assets": {}}, {f"/assets/{name}": "required" for name in ASSETS}),
        (PATH, QUESTION | {"assets": ASSETS | {"names": ["A", 1, "B"]}}, {"/assets/names/1": "not_text"}),
        (PATH, QUESTION | {"assets": ASSETS | {"names": "A"}}, {"/assets/names": "not_an_array"}),
        (PATH, QUESTION | {"assets": ASSETS | {"names": []}}, {"/assets/names": "empty"}),
        (
            PATH,
            QUESTION | {"assets": ASSETS | {"volatilities": [0.1, 0.2]}},
            {"/assets/volatilities": "lengths_differ"},
        ),
        (PATH, QUESTION | {"assets": ASSETS | {"colour": 1}}, {"/assets/colour": "unknown_field"}),
        (
            PATH,
            QUESTION | {"assets": ASSETS | {"correlations": [[1, 0.9, -0.9], [0.9, 1, 0.9], [-0.9, 0.9, 1]]}},
            {"/assets/correlations": "not_a_correlation_matrix"},
        ),
        (PATH, QUESTION | {"threshold": 0.5}, {"/threshold": "no_mix_above_threshold"}),
        (PATH, QUESTION | {"threshold": -1}, {"/threshold": "must_be_above"}),
        (PATH, QUESTION | {"objective": "expected_return"}, {"/limits": "required"}),
        (
            PATH,
            QUESTION | {"objective": "expected_return", "limits": {"shortfall_probability": 0.6}},
            {"/limits/shortfall_probability": "probability_not_below_half"},
        ),
        (
            PATH,
            QUESTION | {"objective": "quantile_return", "quantile_probability": 0.5},
            {"/quantile_probability": "probability_not_below_half"},
        ),
        (PATH, QUESTION | {"weight_limits": [{"least": 0.5}]}, {"/weight_limits/0/asset": "required"}),
        (PATH, QUESTION | {"weight_limits": [{"asset": "Gold"}, 5]}, {"/weight_limits/1": "not_an_object"}),
        (
            PATH,
            QUESTION | {"weight_limits": [{"asset": "Bonds", "least": 2}]},
            {"/weight_limits/0/least": "must_be_at_most"},
        ),
        (PATH, QUESTION | {"weight_limits": []}, {"/weight_limits": "empty"}),
        (PATH, QUESTION | {"weight_limits": {}}, {"/weight_limits": "not_an_array"}),
        (PATH, QUESTION | {"weight_limits": [{"asset": "Bonds"}] * 201}, {"/weight_limits": "too_many"}),
        ("/v1/shortfalls", {"portfolio": MIXES[0], "threshold": 0}, {"/assets": "required"}),
        (
            "/v1/shortfalls",
            {"portfolio": {"weights": [{"asset": "Gold", "weight": 1}]}, "assets": ASSETS, "threshold": 0},
            {"/portfolio/weights/0/asset": "unknown_asset"},
        ),
        (
            "/v1/shortfalls",
            {"portfolio": {"weights": [{"asset": "Bonds", "weight": 0.5}] * 2}, "assets": ASSETS, "threshold": 0},
            {"/portfolio/weights/1/asset": "given_twice"},
        ),
        (
            "/v1/shortfalls",
            {"portfolio": {"weights": [{"asset": "Bonds", "weight": 0.5}]}, "assets": ASSETS, "threshold": 0},
            {"/portfolio/weights": "must_add_up_to_one"},
        ),
        (
            "/v1/shortfalls",
            {
                "portfolio": MIXES[0] | {"returns": {"model": "empirical", "observations": [0.1]}},
                "assets": ASSETS,
                "threshold": 0,
            },
            {"/portfolio/weights": "does_not_go_together"},
        ),
        (
            "/v1/rankings",
            {
                "portfolios": [MIXES[0], {"weights": [{"asset": "Bonds", "weight": 2}]}],
                "assets": ASSETS,
                "threshold": 0,
            },
            {"/portfolios/1/weights": "must_add_up_to_one"},
        ),
        (
            "/v1/rankings",
            {
                "portfolio_columns": {"model": "normal", "expected_return": [0.1], "volatility": [0.1]},
                "assets": ASSETS,
                "threshold": 0,
            },
            {"/assets": "does_not_go_together"},
        ),
    ],
)
def test_what_does_not_fit(ask: Asker, path: str, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(path, question) == expected
