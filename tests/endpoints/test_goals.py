"""POST /v1/goal-outlooks and /v1/goal-requirements. The figures themselves are tested in tests/core/goals."""

from typing import Any

import pytest

from service.core.returns import RETURN_MODELS
from tests.conftest import Asker

OUTLOOKS, REQUIREMENTS = "/v1/goal-outlooks", "/v1/goal-requirements"
LOGNORMAL = {"model": "lognormal", "expected_return": 0.05, "volatility": 0.12}
SAVING: dict[str, Any] = {
    "initial_value": 10000,
    "cash_flows": [{"amount": 300, "every": "month", "to_year": 5}],
    "horizon_years": 5,
    "target": 32000,
    "returns": LOGNORMAL,
}
SPENDING: dict[str, Any] = {
    "initial_value": 100000,
    "cash_flows": [{"amount": -6000, "every": "year"}],
    "horizon_years": 25,
    "target": 0,
    "returns": LOGNORMAL,
}


def reasons(answer: dict[str, Any]) -> dict[str, str]:
    return {each["pointer"]: each["reason"] for each in answer["null_reasons"]}


def codes(answer: dict[str, Any]) -> set[str]:
    return {caution["code"] for caution in answer["cautions"]}


class TestOutlooks:
    def test_the_three_ends_of_a_plan_add_up(self, ask: Asker) -> None:
        answer = ask.answer(OUTLOOKS, SPENDING | {"target": 50000})
        ends = ("success_probability", "depletion_probability", "solvent_below_target_probability")
        assert sum(answer[name] for name in ends) == pytest.approx(1, abs=1e-11)
        assert all(answer[name] > 0.05 for name in ends)
        assert answer["basis"]["numerical_error"] <= 1e-10

    def test_by_year_begins_at_nought_and_ends_at_the_horizon(self, ask: Asker) -> None:
        years = ask.answer(OUTLOOKS, SPENDING)["by_year"]
        assert years["year"] == list(range(26))
        assert years["depletion_probability"] == sorted(years["depletion_probability"])
        assert [band["probability"] for band in years["bands"]] == [0.05, 0.25, 0.5, 0.75, 0.95]
        assert all(len(band["wealth"]) == 26 for band in years["bands"])

    def test_no_sampling_the_same_answer_every_time(self, ask: Asker) -> None:
        first, second = (ask.client.post(OUTLOOKS, json=SPENDING).get_data() for _ in range(2))
        assert first == second

    def test_several_targets_from_one_run(self, ask: Asker) -> None:
        plain = {name: value for name, value in SAVING.items() if name != "target"}
        answer = ask.answer(OUTLOOKS, plain | {"targets": [30000, 32000]})
        assert answer["success_probability"] == answer["by_target"][0]["success_probability"]
        alone = ask.answer(OUTLOOKS, SAVING)
        for name, value in alone["by_target"][0].items():
            assert answer["by_target"][1][name] == pytest.approx(value, rel=1e-9)

    def test_a_glide_path_of_one_law_is_that_law(self, ask: Asker) -> None:
        plain = {name: value for name, value in SAVING.items() if name != "returns"}
        legs = [{"until_year": 2, "returns": LOGNORMAL}, {"until_year": 5, "returns": LOGNORMAL}]
        assert ask.answer(OUTLOOKS, plain | {"glide_path": legs})["success_probability"] == pytest.approx(
            ask.answer(OUTLOOKS, SAVING)["success_probability"], abs=1e-11
        )

    def test_inflation_and_fee_lower_the_chance(self, ask: Asker) -> None:
        plain = ask.answer(OUTLOOKS, SAVING)["success_probability"]
        answer = ask.answer(OUTLOOKS, SAVING | {"inflation_rate": 0.02})
        assert answer["success_probability"] < plain
        assert "steady_inflation" in codes(answer)
        assert ask.answer(OUTLOOKS, SAVING | {"yearly_fee": 0.01})["success_probability"] < plain
        shocked = ask.answer(OUTLOOKS, SAVING | {"shock": {"at_year": 2, "return": -0.3}})
        assert shocked["success_probability"] < plain

    def test_lives(self, ask: Asker) -> None:
        life = {"model": "gompertz", "age": 65, "modal_age": 88, "dispersion": 9.5}
        one = ask.answer(OUTLOOKS, SPENDING | {"lifetime": life})
        assert 0 < one["lifetime_depletion_probability"] < one["depletion_probability"]
        assert "life_beyond_horizon" in codes(one)
        two = ask.answer(OUTLOOKS, SPENDING | {"lives": [life, life]})
        assert two["alive_at_horizon"] == pytest.approx(1 - (1 - one["alive_at_horizon"]) ** 2)
        table = {"model": "table", "yearly_survival": [0.97] * 25}
        assert ask.answer(OUTLOOKS, SPENDING | {"lifetime": table})["alive_at_horizon"] == pytest.approx(0.97**25)
        without = ask.answer(OUTLOOKS, SPENDING)
        assert without["lifetime_depletion_probability"] is None
        assert reasons(without)["/lifetime_depletion_probability"] == "needs_lifetime"

    def test_sensitivities_on_request(self, ask: Asker) -> None:
        assert reasons(ask.answer(OUTLOOKS, SAVING))["/sensitivities"] == "not_computed"
        found = ask.answer(OUTLOOKS, SAVING | {"sensitivities": True})["sensitivities"]
        assert found["expected_return"] > 0
        assert found["contributions"] > 0

    def test_outcomes_on_request(self, ask: Asker) -> None:
        answer = ask.answer(OUTLOOKS, SAVING | {"equally_likely_outcomes": 4})
        assert answer["outcomes"] == sorted(answer["outcomes"])
        assert len(answer["outcomes"]) == 4
        assert "outcomes" not in ask.answer(OUTLOOKS, SAVING)

    def test_money_that_lasts_beyond_the_horizon_is_said(self, ask: Asker) -> None:
        answer = ask.answer(OUTLOOKS, SAVING)
        assert reasons(answer)["/money_lasts/0/years"] == "beyond_horizon"
        short = ask.answer(OUTLOOKS, SPENDING | {"cash_flows": [{"amount": -12000, "every": "year"}]})
        assert short["money_lasts"][2]["years"] < 25

    def test_cautions_of_plans(self, ask: Asker) -> None:
        found = codes(ask.answer(OUTLOOKS, SPENDING))
        assert {
            "model_not_forecast",
            "success_hides_size",
            "bands_are_not_paths",
            "same_spending_whatever_happens",
            "estimates_taken_as_true",
        } <= found

    @pytest.mark.parametrize("model", sorted(RETURN_MODELS))
    def test_returns_of_a_portfolio_go_into_a_plan_unchanged(self, ask: Asker, model: str) -> None:
        models = {each["name"]: each for each in ask.get("/v1/return-models").get_json()["return_models"]}
        listed = models[model]["parameterisations"][0]["parameters"]
        returns = {"model": model, "period": "year"} | {each["name"]: each["example"] for each in listed}
        # without flows, reaching the target is keeping a floor over the horizon
        portfolio = {"portfolio": {"name": "Harbour", "returns": returns}, "threshold": 0.04, "horizon_years": 2}
        floor = ask.answer("/v1/shortfalls", portfolio)
        plan = {"initial_value": 1000, "horizon_years": 2, "target": 1000 * 1.04**2, "returns": returns}
        goal = ask.answer(OUTLOOKS, plan)
        error = goal["basis"]["numerical_error"] + floor["basis"]["numerical_error"]
        assert 1 - goal["success_probability"] == pytest.approx(floor["shortfall_probability"], abs=error + 1e-12)

    def test_plans_side_by_side(self, ask: Asker) -> None:
        batch = ask.answer(OUTLOOKS, {"questions": [SAVING, SPENDING]})
        assert batch["answers"][0]["success_probability"] == ask.answer(OUTLOOKS, SAVING)["success_probability"]
        assert ask.faults(OUTLOOKS, {"questions": [SAVING, SAVING | {"yearly_fee": 1}]}) == {
            "/questions/1/yearly_fee": "must_be_below"
        }
        assert ask.faults(OUTLOOKS, {"questions": [SPENDING | {"horizon_years": 100}] * 1000}) == {
            "/questions": "too_much_work"
        }

    @pytest.mark.parametrize(
        ("changed", "expected"),
        [
            ({"initial_value": None}, {"/initial_value": "required"}),
            ({"initial_value": -1}, {"/initial_value": "must_not_be_negative"}),
            ({"target": None}, {"": "required"}),
            ({"targets": [1]}, {"/targets": "does_not_go_together"}),
            ({"returns": None}, {"": "required"}),
            (
                {"returns": {"model": "lognormal"}},
                {"/returns/expected_return": "required", "/returns/volatility": "required"},
            ),
            ({"cash_flows": [{"every": "month"}]}, {"/cash_flows/0/amount": "required"}),
            ({"cash_flows": [{"amount": 1, "every": "week"}]}, {"/cash_flows/0/every": "unknown_choice"}),
            ({"cash_flows": [{"amount": 1}]}, {"/cash_flows/0/every": "required"}),
            (
                {"cash_flows": [{"amount": 1, "every": "year", "from_year": 3, "to_year": 2}]},
                {"/cash_flows/0/to_year": "out_of_order"},
            ),
            ({"cash_flows": [{"amount": 1, "every": "year", "froom": 3}]}, {"/cash_flows/0/froom": "unknown_field"}),
            ({"cash_flows": {}}, {"/cash_flows": "not_an_array"}),
            ({"cash_flows": [5]}, {"/cash_flows/0": "not_an_object"}),
            ({"horizon_years": 0}, {"/horizon_years": "must_be_positive"}),
            ({"shock": {"at_year": 2}}, {"/shock/return": "required"}),
            ({"shock": {"at_year": 7, "return": -0.3}}, {"/shock/at_year": "must_be_below"}),
            ({"sensitivities": 1}, {"/sensitivities": "not_true_or_false"}),
            ({"lifetime": {}}, {"/lifetime/model": "required"}),
            ({"lifetime": {"model": "gomperz"}}, {"/lifetime/model": "unknown_choice"}),
            (
                {"lifetime": {"model": "gompertz", "age": 65}},
                {"/lifetime/modal_age": "required", "/lifetime/dispersion": "required"},
            ),
            ({"lifetime": {"model": "table", "yearly_survival": [0.9]}}, {"/lifetime/yearly_survival": "too_few"}),
            ({"lives": []}, {"/lives": "too_few"}),
            ({"lives": {}}, {"/lives": "not_an_array"}),
            (
                {"lives": [{"model": "table"}, {"model": "table", "yearly_survival": [2]}]},
                {"/lives/0/yearly_survival": "required", "/lives/1/yearly_survival/0": "must_be_at_most"},
            ),
            (
                {
                    "lives": [{"model": "table", "yearly_survival": [0.9] * 5}] * 2,
                    "lifetime": {"model": "table", "yearly_survival": [0.9] * 5},
                },
                {"/lives": "does_not_go_together"},
            ),
            ({"parameter_uncertainty": "predictive"}, {"/returns/sample_size": "required"}),
        ],
    )
    def test_what_does_not_fit(self, ask: Asker, changed: dict[str, Any], expected: dict[str, str]) -> None:
        assert ask.faults(OUTLOOKS, SAVING | changed) == expected

    def test_glide_paths_that_do_not_fit(self, ask: Asker) -> None:
        plain = {name: value for name, value in SAVING.items() if name != "returns"}
        assert ask.faults(OUTLOOKS, plain | {"glide_path": [{"until_year": 3, "returns": LOGNORMAL}]}) == {
            "/glide_path/0/until_year": "must_be_at_least"
        }
        wrong: list[dict[str, Any]] = [
            {"returns": {"model": "empirical", "observations": [-2]}},
            {"until_year": 5, "returns": LOGNORMAL},
        ]
        assert ask.faults(OUTLOOKS, plain | {"glide_path": wrong}) == {"/glide_path/0/until_year": "required"}
        wrong[0] = {"until_year": 2} | wrong[0]
        assert ask.faults(OUTLOOKS, plain | {"glide_path": wrong}) == {
            "/glide_path/0/returns/observations/0": "must_be_at_least"
        }


def asked(plan: dict[str, Any], solve_for: str, wanted: float = 0.85, **more: Any) -> dict[str, Any]:
    """Leave out what is solved for."""
    left = {name: value for name, value in plan.items() if name != solve_for}
    if solve_for in ("contribution", "withdrawal"):
        flow = {name: value for name, value in plan["cash_flows"][0].items() if name != "amount"}
        left |= {"cash_flows": [flow]}
    return left | {"solve_for": solve_for, "wanted_success_probability": wanted} | more


class TestRequirements:
    @pytest.mark.parametrize("solve_for", ["contribution", "initial_value", "target"])
    def test_the_value_gives_the_wanted_chance(self, ask: Asker, solve_for: str) -> None:
        answer = ask.answer(REQUIREMENTS, asked(SAVING, solve_for))
        assert answer["outcome"] == "found"
        assert answer["outlook"]["success_probability"] == pytest.approx(0.85, abs=1e-10)
        assert answer["value_pointer"] == {"contribution": "/cash_flows/0/amount"}.get(solve_for, f"/{solve_for}")
        assert "holds_after" not in answer
        filled = dict(SAVING)
        if solve_for == "contribution":
            filled["cash_flows"] = [SAVING["cash_flows"][0] | {"amount": answer["value"]}]
        else:
            filled[solve_for] = answer["value"]
        assert ask.answer(OUTLOOKS, filled)["success_probability"] == pytest.approx(0.85, abs=1e-10)

    def test_a_withdrawal_is_below_nought_and_rounded_to_the_safe_side(self, ask: Asker) -> None:
        answer = ask.answer(REQUIREMENTS, asked(SPENDING, "withdrawal", 0.9, of="solvency"))
        assert answer["value"] < 0
        for row in answer["rounded"]:
            assert 0 >= row["value"] >= answer["value"]
            assert row["value"] % row["to"] == 0
            assert row["success_probability"] >= 0.9

    def test_a_horizon_says_whether_it_holds(self, ask: Asker) -> None:
        answer = ask.answer(REQUIREMENTS, asked(SAVING, "horizon_years", which="first"))
        assert answer["holds_after"] is True
        assert answer["outlook"]["success_probability"] >= 0.85

    def test_unattainable_is_an_answer(self, ask: Asker) -> None:
        answer = ask.answer(REQUIREMENTS, asked(SPENDING | {"initial_value": 1000, "target": 1e6}, "withdrawal", 0.99))
        assert answer["outcome"] == "unattainable"
        assert (answer["value"], answer["outlook"], answer["rounded"]) == (None, None, [])
        assert 0 <= answer["attainable_success_probability"] < 0.99
        assert reasons(answer) == {"/value": "unattainable", "/outlook": "unattainable"}

    def test_null_figures_of_the_inner_outlook_are_explained(self, ask: Asker) -> None:
        answer = ask.answer(REQUIREMENTS, asked(SAVING, "contribution"))
        found = reasons(answer)
        assert found["/attainable_success_probability"] == "not_computed"
        assert found["/outlook/money_lasts/0/years"] == "beyond_horizon"
        assert found["/outlook/sensitivities"] == "not_computed"

    @pytest.mark.parametrize(
        ("question", "expected"),
        [
            (
                SAVING | {"solve_for": "contribution", "wanted_success_probability": 0.85},
                {"/cash_flows": "required"},  # none lacks the amount to be found
            ),
            (asked(SAVING, "profit"), {"/solve_for": "unknown_choice"}),
            (asked(SAVING, "target", 1), {"/wanted_success_probability": "must_be_at_most"}),
            (asked(SAVING, "target", of="luck"), {"/of": "unknown_choice"}),
            (asked(SAVING, "target") | {"horizon_years": None}, {"/horizon_years": "required"}),
            (asked(SAVING, "target", sensitivities=True), {"/sensitivities": "unknown_field"}),
        ],
    )
    def test_what_does_not_fit(self, ask: Asker, question: object, expected: dict[str, str]) -> None:
        assert ask.faults(REQUIREMENTS, question) == expected
