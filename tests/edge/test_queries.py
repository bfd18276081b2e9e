"""GET: the body flattened into a query."""

import json

import pytest

from tests.conftest import Asker, RunningService

PATH = "/v1/probabilities"
LAW = "family=normal&mean=10&standard_deviation=2"


def faults(ask: Asker, query: str) -> dict[str, str]:
    response = ask.get(f"{PATH}?{query}")
    assert response.status_code == 422, response.get_data(as_text=True)
    return {fault["parameter"]: fault["code"] for fault in response.get_json()["errors"]}


def test_a_query_answers_as_the_body_that_it_stands_for(ask: Asker) -> None:
    body = {
        "distribution": {"family": "normal", "mean": [10, 11], "standard_deviation": 2},
        "event": {"at_least": 8, "below": [11, 12]},
    }
    by_get = ask.get(f"{PATH}?family=normal&mean=10,11&standard_deviation=2&at_least=8&below=11,12").get_json()
    by_post = ask.answer(PATH, body)
    assert by_get | {"basis": None} == by_post | {"basis": None}


def test_an_encoded_comma_and_exponents_are_read(ask: Asker) -> None:
    assert ask.get(f"{PATH}?{LAW}&below=1e1%2C1.1E%2B1").get_json()["length"] == 2


def test_a_list_of_one_stays_a_list_for_observations(ask: Asker) -> None:
    answer = ask.get(f"{PATH}?family=empirical&observations=0.01&at_most=0").get_json()
    assert answer["form"] == "number"
    assert answer["probability"] == 0


@pytest.mark.parametrize(
    ("query", "expected"),
    [
        (f"{LAW}&below=11&below=12", {"below": "given_twice"}),
        (f"{LAW}&below=11&colour=red", {"colour": "unknown_field"}),
        (f"{LAW}&below=11&questions=1", {"questions": "only_in_post"}),
        (f"{LAW}&below=11&components=1", {"components": "only_in_post"}),
        (f"{LAW}&below=eleven", {"below": "not_a_number"}),
        (f"{LAW}&below=", {"below": "not_a_number"}),
        (f"{LAW}&below=0x10", {"below": "not_a_number"}),
        (f"{LAW}&below=1_000", {"below": "not_a_number"}),
        (f"{LAW}&below=01", {"below": "not_a_number"}),
        (f"{LAW}&below=NaN", {"below": "not_a_number"}),
        (f"{LAW}&below=1e999", {"below": "number_out_of_range"}),
        (f"{LAW}&below=9007199254740993", {"below": "integer_too_large"}),
        (LAW, {"": "no_event"}),
        ("below=1", {"family": "required"}),
        (f"{LAW}&below=11&distribution=normal", {"distribution": "unknown_field"}),
        ("family=normal&mean=10&below=1", {"standard_deviation": "required"}),
        (f"{LAW}&above=3&below=2", {"below": "bounds_crossed"}),
    ],
)
def test_a_query_that_does_not_fit_names_the_parameter(ask: Asker, query: str, expected: dict[str, str]) -> None:
    assert faults(ask, query) == expected


def test_a_fault_in_a_list_names_the_entry(ask: Asker) -> None:
    errors = ask.get(f"{PATH}?{LAW}&below=1,x,3").get_json()["errors"]
    assert [(fault["parameter"], fault["index"]) for fault in errors] == [("below", 1)]


@pytest.mark.parametrize("query", [f"{LAW}&below=%zz", f"{LAW}&below=%4", f"{LAW}&be%ff=1"])
def test_a_broken_query_is_400(running: RunningService, query: str) -> None:
    answer = running.send(f"GET {PATH}?{query} HTTP/1.1\r\nHost: localhost\r\n\r\n".encode())
    assert answer.status == 400
    assert answer.headers["content-type"] == "application/problem+json"


@pytest.mark.parametrize(
    ("query", "code"),
    [(f"{LAW}&below=11&below=12", "given_twice"), (f"{LAW}&below=11&colour=red", "unknown_field")],
)
def test_a_parameter_given_twice_or_unknown_is_422_over_a_socket(
    running: RunningService, query: str, code: str
) -> None:
    answer = running.send(f"GET {PATH}?{query} HTTP/1.1\r\nHost: localhost\r\n\r\n".encode())
    assert answer.status == 422
    assert answer.headers["content-type"] == "application/problem+json"
    assert [fault["code"] for fault in json.loads(answer.body)["errors"]] == [code]


def test_post_takes_no_query(ask: Asker) -> None:
    response = ask.client.post(f"{PATH}?mean=1", json={})
    assert response.status_code == 422
    assert response.get_json()["errors"][0]["parameter"] == "mean"


def test_catalogues_take_no_query(ask: Asker) -> None:
    assert ask.get("/v1/codes?page=2").status_code == 422
    assert ask.get("/v1/codes?").status_code == 200
