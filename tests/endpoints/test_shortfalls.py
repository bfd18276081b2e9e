"""POST /v1/shortfalls: forms, defaults, cautions, faults. The figures themselves are tested in tests/core/portfolio."""

from typing import Any

import numpy as np
import pytest

from tests.conftest import Asker

PATH = "/v1/shortfalls"
BALANCED: dict[str, Any] = {
    "name": "Balanced",
    "returns": {"model": "normal", "expected_return": 0.06, "volatility": 0.1},
}


def test_one_floor_answers_every_figure(ask: Asker) -> None:
    answer = ask.answer(PATH, {"portfolio": BALANCED, "threshold": 0.02})
    assert answer["form"] == "number"
    assert answer["shortfall_probability"] == pytest.approx(0.34457825839, rel=1e-10)
    assert answer["frequencies"] == {"shortfall_probability": {"count": 34, "out_of": 100, "bound": "about"}}
    assert answer["safety_first_ratio"] == pytest.approx(0.4)
    assert answer["threshold_at_probability"]["probability"] == 0.05
    assert [loss["confidence_level"] for loss in answer["tail_losses"]] == [0.95, 0.99]
    assert answer["null_reasons"] == [{"pointer": "/log_safety_first_ratio", "reason": "no_value"}]
    assert "outcomes" not in answer


def test_a_list_of_floors_answers_arrays(ask: Asker) -> None:
    floors = [-0.1, 0.0, 0.02]
    answer = ask.answer(PATH, {"portfolio": BALANCED, "threshold": floors, "equally_likely_outcomes": 4})
    assert (answer["form"], answer["length"]) == ("list", 3)
    alone = [ask.answer(PATH, {"portfolio": BALANCED, "threshold": floor}) for floor in floors]
    assert answer["shortfall_probability"] == [each["shortfall_probability"] for each in alone]
    assert answer["lower_partial_moments"]["order_2"] == [each["lower_partial_moments"]["order_2"] for each in alone]
    assert answer["tail_losses"][0]["value_at_risk"] == [alone[0]["tail_losses"][0]["value_at_risk"]] * 3
    assert answer["tail_losses"][0]["confidence_level"] == 0.95
    counts = [each["frequencies"]["shortfall_probability"]["count"] for each in alone]
    assert answer["frequencies"]["shortfall_probability"] == {"count": counts, "out_of": 100, "bound": ["about"] * 3}
    assert answer["log_safety_first_ratio"] == [None] * 3
    assert answer["null_reasons"] == [{"pointer": "/log_safety_first_ratio", "reason": "no_value"}]
    # the outcomes are the same for every floor
    assert (
        answer["outcomes"]
        == ask.answer(PATH, {"portfolio": BALANCED, "threshold": 0, "equally_likely_outcomes": 4})["outcomes"]
    )


def test_frequencies_of_different_sizes_are_listed(ask: Asker) -> None:
    answer = ask.answer(PATH, {"portfolio": BALANCED, "threshold": [-0.3, 0.02]})
    assert answer["frequencies"]["shortfall_probability"]["out_of"] == [100_000, 100]


def test_equally_likely_outcomes_are_listed_worst_first(ask: Asker) -> None:
    answer = ask.answer(PATH, {"portfolio": BALANCED, "threshold": 0.02, "equally_likely_outcomes": 10})
    assert answer["outcomes"] == sorted(answer["outcomes"])
    assert len(answer["outcomes"]) == 10
    # the fifth and the sixth lie about the mean of a symmetric law
    assert sum(answer["outcomes"][4:6]) / 2 == pytest.approx(0.06)


def test_cautions_stand_beside_the_figures(ask: Asker) -> None:
    codes = [c["code"] for c in ask.answer(PATH, {"portfolio": BALANCED, "threshold": 0.02})["cautions"]]
    assert codes == [
        "model_not_forecast",
        "chance_not_size",
        "gap_over_all_outcomes",
        "loss_from_today_only",
        "not_the_most_you_can_lose",
    ]
    ten_years = {
        "portfolio": {"returns": {"model": "lognormal", "expected_return": 0.05, "volatility": 0.12}},
        "threshold": 0.02,
        "horizon_years": 10,
    }
    assert "longer_is_not_safer" in [c["code"] for c in ask.answer(PATH, ten_years)["cautions"]]


def test_a_floor_and_a_volatility_in_per_cent_are_answered_with_a_caution(ask: Asker) -> None:
    returns = {"model": "normal", "expected_return": 0.06, "volatility": 10}
    found = [
        c
        for c in ask.answer(PATH, {"portfolio": {"returns": returns}, "threshold": 2})["cautions"]
        if c["code"] == "looks_like_percent"
    ]
    assert [c["pointer"] for c in found] == ["/threshold", "/portfolio/returns/volatility"]


def test_levels_of_the_other_tail_are_answered_with_a_caution(ask: Asker) -> None:
    question = {"portfolio": BALANCED, "threshold": 0, "confidence_levels": [0.05, 0.95], "quantile_probability": 0.95}
    found = [c for c in ask.answer(PATH, question)["cautions"] if c["code"] == "unusual_level"]
    assert [(c["pointer"], c["params"]["perhaps"]) for c in found] == [
        ("/confidence_levels/0", 0.95),
        ("/quantile_probability", pytest.approx(0.05)),
    ]


def test_the_horizon_of_laws_that_divide_is_free(ask: Asker) -> None:
    returns = {"model": "lognormal", "expected_return": 0.05, "volatility": 0.12}
    answer = ask.answer(PATH, {"portfolio": {"returns": returns}, "threshold": 0.02, "horizon_years": 2.5})
    assert answer["expected_return"] == pytest.approx(1.05**2.5 - 1, rel=1e-13)


def test_a_period_of_its_own_length(ask: Asker) -> None:
    observations = [0.01, -0.02, 0.003, 0.0, -0.02]
    returns = {"model": "empirical", "observations": observations, "period": "day"}
    question = {"portfolio": {"returns": returns}, "threshold": 0, "threshold_basis": "over_horizon"}
    answer = ask.answer(PATH, question | {"horizon_years": 1 / 252})
    assert answer["shortfall_probability"] == pytest.approx(np.mean(np.array(observations) < 0))
    assert answer["basis"]["method"] == "counting"
    # two days: all 25 pairs, counted
    growth = np.multiply.outer(1 + np.array(observations), 1 + np.array(observations))
    answer = ask.answer(PATH, question | {"horizon_years": 2 / 252})
    assert answer["shortfall_probability"] == pytest.approx(np.mean(growth < 1))


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({}, {"/portfolio": "required", "/threshold": "required"}),
        ({"portfolio": {}, "threshold": 0}, {"/portfolio/returns": "required"}),
        (
            {"portfolio": {"returns": {"model": "normal"}, "nme": "x"}, "threshold": 0},
            {
                "/portfolio/nme": "unknown_field",
                "/portfolio/returns/expected_return": "required",
                "/portfolio/returns/volatility": "required",
            },
        ),
        ({"portfolio": {"returns": {"model": "norml"}}, "threshold": 0}, {"/portfolio/returns/model": "unknown_model"}),
        (
            {"portfolio": {"returns": BALANCED["returns"] | {"volatility": -0.06}}, "threshold": 0},
            {"/portfolio/returns/volatility": "must_not_be_negative"},
        ),
        (
            {"portfolio": {"returns": BALANCED["returns"] | {"volatility": [0.1]}}, "threshold": 0},
            {"/portfolio/returns/volatility": "no_arrays"},
        ),
        (
            {"portfolio": {"returns": BALANCED["returns"] | {"period": "fortnight"}}, "threshold": 0},
            {"/portfolio/returns/period": "unknown_choice"},
        ),
        (
            {
                "portfolio": {"returns": BALANCED["returns"] | {"compounding": "continuous", "model": "lognormal"}},
                "threshold": 0,
            },
            {"/portfolio/returns/compounding": "compounding_not_available"},
        ),
        (
            {"portfolio": {"returns": {"model": "empirical", "observations": [0.1, -1.5]}}, "threshold": 0},
            {"/portfolio/returns/observations/1": "must_be_at_least"},
        ),
        ({"portfolio": {"name": 5, "returns": BALANCED["returns"]}, "threshold": 0}, {"/portfolio/name": "not_text"}),
        (
            {"portfolio": {"name": "n" * 201, "returns": BALANCED["returns"]}, "threshold": 0},
            {"/portfolio/name": "too_long"},
        ),
        ({"portfolio": BALANCED, "threshold": -1}, {"/threshold": "must_be_above"}),
        ({"portfolio": BALANCED, "threshold": [0, -2]}, {"/threshold/1": "must_be_above"}),
        ({"portfolio": BALANCED, "threshold": 0, "horizon_years": 0}, {"/horizon_years": "must_be_positive"}),
        ({"portfolio": BALANCED, "threshold": 0, "horizon_years": 1.5}, {"/horizon_years": "horizon_not_divisible"}),
        (
            {"portfolio": BALANCED, "threshold": 0, "confidence_levels": [0.9, 1]},
            {"/confidence_levels/1": "must_be_below"},
        ),
        ({"portfolio": BALANCED, "threshold": 0, "confidence_levels": 0.9}, {"/confidence_levels": "not_an_array"}),
        ({"portfolio": BALANCED, "threshold": 0, "confidence_levels": [0.9] * 21}, {"/confidence_levels": "too_many"}),
        (
            {"portfolio": BALANCED, "threshold": 0, "quantile_probability": 0},
            {"/quantile_probability": "must_be_positive"},
        ),
        (
            {"portfolio": BALANCED, "threshold": 0, "equally_likely_outcomes": 2.5},
            {"/equally_likely_outcomes": "must_be_whole"},
        ),
        (
            {"portfolio": BALANCED, "threshold": 0, "parameter_uncertainty": "predictive"},
            {"/portfolio/returns/sample_size": "required"},
        ),
    ],
)
def test_what_does_not_fit_is_named_by_pointer_and_code(ask: Asker, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(PATH, question) == expected


def test_the_words_of_a_fault_say_what_to_do(ask: Asker) -> None:
    returns = {"model": "normal", "expected_retrun": 0.06, "volatility": -0.06}
    body = ask.client.post(PATH, json={"portfolio": {"returns": returns}, "threshold": 0}).get_json()
    words = {fault["pointer"].rsplit("/", 1)[1]: fault["detail"] for fault in body["errors"]}
    assert words == {
        "volatility": "volatility must be 0 or more; it is -0.06.",
        "expected_retrun": "There is no field expected_retrun here; expected_return is missing.",
        "expected_return": "expected_return is needed by normal.",
    }
    assert body["detail"] == "3 faults in the body; each is listed under errors."


BENT = {"model": "cornish_fisher", "expected_return": 0.06, "volatility": 0.1, "skewness": -0.5, "excess_kurtosis": 2}


def test_moments_of_bent_returns_are_parameters_or_matched(ask: Asker) -> None:
    plain = ask.answer(PATH, {"portfolio": {"returns": BENT}, "threshold": 0})
    same = ask.answer(PATH, {"portfolio": {"returns": BENT | {"moments": "parameters"}}, "threshold": 0})
    assert plain | {"basis": 0} == same | {"basis": 0}
    matched = ask.answer(PATH, {"portfolio": {"returns": BENT | {"moments": "matched"}}, "threshold": 0})
    moments = matched["actual_moments"]
    assert moments["standard_deviation"] == pytest.approx(0.1, rel=1e-9)
    assert moments["skewness"] == pytest.approx(-0.5, rel=1e-9)
    assert moments["excess_kurtosis"] == pytest.approx(2, rel=1e-9)
    wrong = {"portfolio": {"returns": BENT | {"moments": "guessed"}}, "threshold": 0}
    assert ask.faults(PATH, wrong) == {"/portfolio/returns/moments": "unknown_choice"}
    # other models have no such word
    other = {"portfolio": {"returns": BALANCED["returns"] | {"moments": "matched"}}, "threshold": 0}
    assert ask.faults(PATH, other) == {"/portfolio/returns/moments": "unknown_field"}


def test_every_return_model_answers_one_period_and_many(ask: Asker) -> None:
    parts = [
        {"weight": 0.9, "expected_return": 0.08, "volatility": 0.12},
        {"weight": 0.1, "expected_return": -0.1, "volatility": 0.35},
    ]
    models: list[dict[str, Any]] = [
        {"model": "normal", "expected_return": 0.06, "volatility": 0.1},
        {"model": "lognormal", "expected_return": 0.06, "volatility": 0.1},
        {"model": "student_t", "expected_return": 0.06, "volatility": 0.1, "degrees_of_freedom": 5},
        BENT,
        {"model": "normal_mixture", "components": parts},
        {"model": "lognormal_mixture", "components": parts},
        {"model": "up_down", "up_return": 0.1, "down_return": -0.05, "up_probability": 0.6, "moves": 2},
        {"model": "empirical", "observations": [0.1, -0.05, 0.2, -0.1, 0.07]},
    ]
    listed = {entry["name"] for entry in ask.get("/v1/return-models").get_json()["return_models"]}
    assert {returns["model"] for returns in models} == listed
    for returns in models:
        for years in (1, 3):
            question = {"portfolio": {"returns": returns}, "threshold": 0.01, "horizon_years": years}
            answer = ask.answer(PATH, question)
            assert 0 < answer["shortfall_probability"] < 1
            assert answer["basis"]["numerical_error"] <= 1e-9
            assert answer["expected_gap"] > 0


def test_a_batch_of_laws_that_have_to_be_compounded_is_counted(ask: Asker) -> None:
    monthly = {
        "model": "student_t",
        "expected_return": 0.005,
        "volatility": 0.04,
        "degrees_of_freedom": 4,
        "period": "month",
    }
    questions = [{"portfolio": {"returns": monthly}, "threshold": 0.02}] * 500
    assert ask.faults(PATH, {"questions": questions}) == {"/questions": "too_much_work"}
    plain = [question | {"horizon_years": 1 / 12} for question in questions]
    assert ask.answer(PATH, {"questions": plain})["length"] == 500


def test_a_batch_of_shortfalls(ask: Asker) -> None:
    questions = [{"portfolio": BALANCED, "threshold": floor} for floor in (0.0, 0.02)]
    batch = ask.answer(PATH, {"questions": questions})
    assert batch["answers"][1]["shortfall_probability"] == pytest.approx(0.34457825839, rel=1e-10)
    questions[1] = questions[1] | {"horizon_years": 1.5}
    assert ask.faults(PATH, {"questions": questions}) == {"/questions/1/horizon_years": "horizon_not_divisible"}
