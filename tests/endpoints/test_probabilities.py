"""POST /v1/probabilities: forms, bounds, faults. GET is tested in tests/edge/test_queries.py."""

import math
from typing import Any, ClassVar

import pytest

from service.edge.app import create_app
from service.edge.settings import Settings
from tests.conftest import Asker

PATH = "/v1/probabilities"
NORMAL = {"family": "normal", "mean": 10, "standard_deviation": 2}
DIE = {"family": "discrete_uniform", "lowest": 1, "highest": 6}


def test_one_number_answers_every_figure(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "event": {"at_least": 8, "below": 12}})
    assert answer["form"] == "number"
    assert answer["probability"] == pytest.approx(0.6826894921370859, rel=1e-15)
    assert answer["complement"] == pytest.approx(0.31731050786291415, rel=1e-15)
    assert answer["log_probability"] == pytest.approx(math.log(answer["probability"]), rel=1e-14)
    assert answer["standard_scores"] == {"lower": -1, "upper": 1}
    assert answer["null_reasons"] == []
    assert answer["cautions"] == []
    assert answer["basis"]["numerical_error_kind"] == "bound"


def test_a_list_answers_arrays_and_objects_keep_their_keys(ask: Asker) -> None:
    law = {"family": "normal", "mean": 0.06, "standard_deviation": [0.1, 0.16, 12]}
    answer = ask.answer(PATH, {"distribution": law, "event": {"below": [0, 0, -1000]}})
    assert (answer["form"], answer["length"]) == ("list", 3)
    assert answer["probability"] == pytest.approx([0.2742531177500736, 0.3538302333272762, 0.0], rel=1e-14)
    # the chance underflows, its logarithm does not
    assert answer["log_probability"][2] == pytest.approx(-3477.980892480418, rel=1e-14)
    assert answer["standard_scores"] == {"lower": [None] * 3, "upper": pytest.approx([-0.6, -0.375, -83.3383333333])}
    assert answer["null_reasons"] == [{"pointer": "/standard_scores/lower", "reason": "no_value"}]
    assert answer["cautions"] == [
        {
            "code": "looks_like_percent",
            "detail": "A standard deviation of 12 beside a mean of 0.06 was perhaps meant as 0.12.",
            "pointer": "/distribution/standard_deviation/2",
            "params": {"given": 12, "perhaps": 0.12, "occurrences": 1},
        }
    ]


def test_an_array_of_one_stays_an_array(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "event": {"below": [11]}})
    assert (answer["form"], answer["length"], len(answer["probability"])) == ("list", 1, 1)


def test_null_is_the_same_as_left_out(ask: Asker) -> None:
    plain = ask.answer(PATH, {"distribution": NORMAL, "event": {"below": 11}})
    nulls = ask.answer(
        PATH, {"distribution": NORMAL | {"family": "normal"}, "event": {"below": 11, "above": None}, "questions": None}
    )
    assert plain | {"basis": None} == nulls | {"basis": None}


def test_a_whole_number_may_be_written_with_a_point(ask: Asker) -> None:
    law = {"family": "binomial", "trials": 20.0, "success_probability": 0.5}
    assert ask.answer(PATH, {"distribution": law, "event": {"exactly": 10}})["probability"] == pytest.approx(
        math.comb(20, 10) / 2**20, rel=1e-13
    )


def test_strict_and_inclusive_bounds_differ_for_whole_numbers(ask: Asker) -> None:
    # common practice, no source: counting the faces of a fair die
    for event, count in [
        ({"above": 4}, 2),
        ({"at_least": 4}, 3),
        ({"below": 4}, 3),
        ({"at_most": 4}, 4),
        ({"exactly": 4}, 1),
        ({"above": 1, "below": 6}, 4),
        ({"at_least": 1, "at_most": 6}, 6),
        ({"exactly": 4.5}, 0),
        ({"at_most": 100}, 6),
    ]:
        answer = ask.answer(PATH, {"distribution": DIE, "event": event})
        assert answer["probability"] == pytest.approx(count / 6, abs=1e-15), event
        assert answer["complement"] == pytest.approx(1 - count / 6, abs=1e-15), event


def test_minus_nought_is_written_nought(ask: Asker) -> None:
    response = ask.client.post(PATH, json={"distribution": NORMAL, "event": {"below": 10}})
    assert b"-0.0" not in response.get_data()


def test_infinite_figures_are_null_with_their_reason(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": DIE, "event": {"exactly": 7}})
    assert (answer["probability"], answer["log_probability"]) == (0, None)
    assert {"pointer": "/log_probability", "reason": "negative_infinity"} in answer["null_reasons"]


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({}, {"/distribution": "required", "/event": "required"}),
        ({"distribution": NORMAL}, {"/event": "required"}),
        ({"distribution": NORMAL, "event": {}}, {"/event": "no_event"}),
        ({"distribution": NORMAL, "event": []}, {"/event": "not_an_object"}),
        ({"distribution": NORMAL, "event": {"below": 1, "at_most": 1}}, {"/event": "bounds_do_not_go_together"}),
        ({"distribution": NORMAL, "event": {"exactly": 1, "above": 1}}, {"/event": "bounds_do_not_go_together"}),
        ({"distribution": NORMAL, "event": {"above": 2, "below": 1}}, {"/event/below": "bounds_crossed"}),
        ({"distribution": NORMAL, "event": {"above": [0, 2], "below": [1, 1]}}, {"/event/below/1": "bounds_crossed"}),
        (
            {"distribution": NORMAL, "event": {"within_standard_deviations": -1}},
            {"/event/within_standard_deviations": "must_not_be_negative"},
        ),
        ({"distribution": NORMAL, "event": {"belo": 1}}, {"/event/belo": "unknown_field"}),
        ({"distribution": NORMAL, "evnt": {"below": 1}}, {"/event": "required", "/evnt": "unknown_field"}),
        ({"distribution": {"family": "norml"}, "event": {"below": 1}}, {"/distribution/family": "unknown_family"}),
        ({"distribution": {"family": 7}, "event": {"below": 1}}, {"/distribution/family": "unknown_family"}),
        ({"distribution": {"mean": 1}, "event": {"below": 1}}, {"/distribution/family": "required"}),
        (
            {"distribution": NORMAL | {"standard_deviation": 0}, "event": {"below": 1}},
            {"/distribution/standard_deviation": "must_be_positive"},
        ),
        (
            {"distribution": NORMAL | {"standard_deviation": [1, -1]}, "event": {"below": 1}},
            {"/distribution/standard_deviation/1": "must_be_positive"},
        ),
        (
            {"distribution": {"family": "normal", "mean": 1, "sd": 2}, "event": {"below": 1}},
            {"/distribution/sd": "unknown_field", "/distribution/standard_deviation": "required"},
        ),
        (
            {"distribution": {"family": "binomial", "trials": 2.5, "success_probability": 2}, "event": {"below": 1}},
            {"/distribution/trials": "must_be_whole", "/distribution/success_probability": "must_be_at_most"},
        ),
        (
            {"distribution": {"family": "uniform", "lower": 2, "upper": 1}, "event": {"below": 1}},
            {"/distribution/upper": "out_of_order"},
        ),
        (
            {
                "distribution": {"family": "lognormal", "mean": 1, "standard_deviation": 1, "log_mean": 0},
                "event": {"below": 1},
            },
            {"/distribution/log_mean": "does_not_go_together"},
        ),
        (
            {"distribution": {"family": "empirical", "observations": 3}, "event": {"below": 1}},
            {"/distribution/observations": "not_an_array"},
        ),
        (
            {"distribution": NORMAL | {"mean": [1, 2]}, "event": {"below": [1, 2, 3]}},
            {"/event/below": "lengths_differ"},
        ),
        (
            {"distribution": NORMAL | {"mean": [1, 2], "standard_deviation": [1]}, "event": {"below": 1}},
            {"/distribution/standard_deviation": "lengths_differ"},
        ),
        (
            {"distribution": NORMAL | {"mean": [1, None]}, "event": {"below": 1}},
            {"/distribution/mean/1": "not_a_number"},
        ),
        (
            {"distribution": {"family": "normal_mixture", "components": []}, "event": {"below": 1}},
            {"/distribution/components": "empty"},
        ),
        (
            {"distribution": {"family": "normal_mixture", "components": {}}, "event": {"below": 1}},
            {"/distribution/components": "not_an_array"},
        ),
        (
            {"distribution": {"family": "normal_mixture", "components": [1] * 101}, "event": {"below": 1}},
            {"/distribution/components": "too_many"},
        ),
        (
            {
                "distribution": {
                    "family": "normal_mixture",
                    "components": [
                        5,
                        {"weight": 0.5, "mean": "a", "standard_deviation": 1},
                        {"weight": 0.5, "meen": 0, "standard_deviation": 1},
                    ],
                },
                "event": {"below": 1},
            },
            {
                "/distribution/components/0": "not_an_object",
                "/distribution/components/1/mean": "not_a_number",
                "/distribution/components/2/mean": "required",
                "/distribution/components/2/meen": "unknown_field",
            },
        ),
        (
            {
                "distribution": {
                    "family": "normal_mixture",
                    "components": [
                        {"weight": 0.5, "mean": 0, "standard_deviation": 1},
                        {"weight": 0.4, "mean": 0, "standard_deviation": 1},
                    ],
                },
                "event": {"below": 1},
            },
            {"/distribution/components": "must_add_up_to_one"},
        ),
        (
            {
                "distribution": {
                    "family": "normal_mixture",
                    "components": [{"weight": 1, "mean": 0, "standard_deviation": -1}],
                },
                "event": {"below": 1},
            },
            {"/distribution/components/0/standard_deviation": "must_be_positive"},
        ),
        ({"distribution": NORMAL | {"mean": [[1]]}, "event": {"below": 1}}, {"/distribution/mean/0": "not_a_number"}),
    ],
)
def test_what_does_not_fit_is_named_by_pointer_and_code(ask: Asker, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(PATH, question) == expected


def test_a_misspelt_field_names_the_closest(ask: Asker) -> None:
    law = {"family": "normal", "mean": 1, "standard_deviaton": 2}
    errors = ask.client.post(PATH, json={"distribution": law, "event": {"below": 1}}).get_json()["errors"]
    misspelt = next(fault for fault in errors if fault["code"] == "unknown_field")
    assert misspelt["params"] == {"closest": "standard_deviation"}
    assert misspelt["detail"] == "There is no field standard_deviaton here; standard_deviation is missing."


def test_the_first_hundred_faults_are_listed_and_all_are_counted(ask: Asker) -> None:
    body = ask.client.post(PATH, json={"questions": [{}] * 80}).get_json()
    assert len(body["errors"]) == 100
    assert body["errors_total"] == 160


def test_too_many_entries_are_refused(ask: Asker) -> None:
    question = {"distribution": NORMAL, "event": {"below": [1] * 100_001}}
    assert ask.faults(PATH, question) == {"/event/below": "too_many"}


class TestWork:
    """Counted before it is computed, so that no question takes seconds."""

    client = create_app(Settings(work_budget=1000)).test_client()
    dear: ClassVar[dict[str, Any]] = {"family": "binomial", "trials": 20, "success_probability": [0.5] * 60}

    def fault(self, path: str, body: object) -> Any:
        response = self.client.post(path, json=body)
        assert response.status_code == 422
        return response.get_json()["errors"][0]

    def test_one_question_beyond_the_budget_is_refused(self) -> None:
        found = self.fault("/v1/moments", {"distribution": self.dear})
        assert (found["pointer"], found["code"]) == ("", "too_much_work")
        assert found["params"] == {"work": 60 * 22, "limit": 1000}

    def test_a_batch_is_counted_together(self) -> None:
        cheap = self.dear | {"success_probability": [0.5] * 30}
        assert self.client.post("/v1/moments", json={"questions": [{"distribution": cheap}]}).status_code == 200
        found = self.fault("/v1/moments", {"questions": [{"distribution": cheap}] * 2})
        assert (found["pointer"], found["code"]) == ("/questions", "too_much_work")

    def test_a_query_is_counted_too(self) -> None:
        many = ",".join(["0.5"] * 60)
        response = self.client.get(f"/v1/moments?family=binomial&trials=20&success_probability={many}")
        assert response.get_json()["errors"][0]["code"] == "too_much_work"


class TestBatch:
    def test_questions_are_answered_in_order_each_with_its_own_basis(self, ask: Asker) -> None:
        questions = [{"distribution": NORMAL, "event": {"below": bound}} for bound in (9, 10, 11)]
        batch = ask.answer(PATH, {"questions": questions})
        assert (batch["form"], batch["length"]) == ("batch", 3)
        for question, answer in zip(questions, batch["answers"], strict=True):
            alone = ask.answer(PATH, question)
            assert answer["basis"].pop("request_fingerprint") is None
            assert alone["basis"].pop("request_fingerprint").startswith("sha256:")
            assert answer == alone
        assert batch["basis"]["request_fingerprint"].startswith("sha256:")
        assert batch["basis"]["numerical_error"] == alone["basis"]["numerical_error"]

    def test_one_that_does_not_fit_refuses_the_whole(self, ask: Asker) -> None:
        questions = [
            {"distribution": NORMAL, "event": {"below": 1}},
            {"distribution": NORMAL},
            3,
            {"distribution": NORMAL, "event": {"above": 2, "below": 1}},
        ]
        assert ask.faults(PATH, {"questions": questions}) == {
            "/questions/1/event": "required",
            "/questions/2": "not_an_object",
            "/questions/3/event/below": "bounds_crossed",
        }

    @pytest.mark.parametrize(
        ("body", "expected"),
        [
            ({"questions": []}, {"/questions": "empty"}),
            ({"questions": {}}, {"/questions": "not_an_array"}),
            ({"questions": [{}] * 1001}, {"/questions": "too_many"}),
            (
                {"questions": [{"distribution": NORMAL, "event": {"below": 1}}], "event": {"below": 1}},
                {"/event": "does_not_go_together"},
            ),
            ({"questions": [{"distribution": NORMAL, "event": {"below": 1}}], "more": 1}, {"/more": "unknown_field"}),
            (
                {"questions": [{"questions": []}]},
                {
                    "/questions/0/questions": "unknown_field",
                    "/questions/0/distribution": "required",
                    "/questions/0/event": "required",
                },
            ),
        ],
    )
    def test_a_batch_that_does_not_fit(self, ask: Asker, body: object, expected: dict[str, str]) -> None:
        assert ask.faults(PATH, body) == expected
