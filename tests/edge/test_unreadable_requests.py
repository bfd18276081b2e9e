"""What cannot be read is refused over a real socket, with the right status, as problem details."""

import json

import pytest

from tests.conftest import RawAnswer, RunningService

PATH = "/v1/probabilities"
NORMAL = b'{"family":"normal","mean":%b,"standard_deviation":2}'


def law(mean: bytes) -> bytes:
    return b'{"distribution":' + NORMAL % mean + b',"event":{"below":1}}'


def problem(answer: RawAnswer) -> dict[str, object]:
    assert answer.headers["content-type"] == "application/problem+json"
    assert answer.headers["cache-control"] == "no-store"
    body: dict[str, object] = json.loads(answer.body)
    assert body["status"] == answer.status
    assert body["request_id"] == answer.headers["request-id"]
    assert body["instance"] == f"/problems/occurrences/{body['request_id']}"
    return body


def codes(answer: RawAnswer) -> list[str]:
    errors = problem(answer)["errors"]
    assert isinstance(errors, list)
    return [fault["code"] for fault in errors]


@pytest.mark.parametrize(
    ("body", "code"),
    [
        pytest.param(b"", "no_body", id="empty"),
        pytest.param(b" \n", "no_body", id="blank"),
        pytest.param(b"{", "not_json", id="cut off"),
        pytest.param(b"{'a':1}", "not_json", id="single quotes"),
        pytest.param(b'{"a":1,}', "not_json", id="trailing comma"),
        pytest.param(b"\xef\xbb\xbf{}", "not_json", id="byte order mark"),
        pytest.param(law(b"NaN"), "not_json", id="NaN"),
        pytest.param(law(b"Infinity"), "not_json", id="Infinity"),
        pytest.param(law(b"-Infinity"), "not_json", id="minus Infinity"),
        pytest.param(law(b"1e999"), "number_out_of_range", id="overflow"),
        pytest.param(law(b"-1e999"), "number_out_of_range", id="negative overflow"),
        pytest.param(law(b"9" * 5000), "number_out_of_range", id="5,000 digits"),
        pytest.param(law(b"9" * 300), "number_out_of_range", id="300 digits"),
        pytest.param(law(b"-" + b"9" * 25), "number_out_of_range", id="25 digits"),
        pytest.param(law(b'1,"mean":2'), "duplicate_key", id="duplicate key"),
        pytest.param(law(b'1,"m\\u0065an":2'), "duplicate_key", id="duplicate key, escaped"),
        pytest.param(b'{"a":[{"b":1,"b":2}],"c":":"}', "duplicate_key", id="duplicate key deep inside"),
        pytest.param(law(b'"\\ud800"'), "not_utf8", id="lone surrogate"),
        pytest.param(law(b'"\xff"'), "not_utf8", id="not UTF-8"),
        pytest.param("{}".encode("utf-16"), "not_utf8", id="UTF-16"),
        pytest.param(b"[" * 40 + b"]" * 40, "too_deep", id="lists a little too deep"),
        pytest.param(b"[" * 30_000 + b"]" * 30_000, "too_deep", id="nested lists"),
        pytest.param(b'{"a":' * 10_000 + b"1" + b"}" * 10_000, "too_deep", id="nested objects"),
        pytest.param(b"[" * 60_000, "too_deep", id="nesting never closed"),
    ],
)
def test_unreadable_bodies_are_400(running: RunningService, body: bytes, code: str) -> None:
    answer = running.post(PATH, body)
    assert answer.status == 400
    assert codes(answer) == [code]
    assert problem(answer)["type"] == "/problems/unreadable"


@pytest.mark.parametrize(
    ("value", "code"),
    [
        (b'"10"', "not_a_number"),
        (b"true", "not_a_number"),
        (b"{}", "not_a_number"),
        (b"[]", "empty"),
        (b"9007199254740993", "integer_too_large"),
        (b"9223372036854775807", "integer_too_large"),
        (b"[1,true]", "not_a_number"),
        (b'["1"]', "not_a_number"),
        (b"[1,9007199254740993]", "integer_too_large"),
    ],
)
def test_readable_numbers_that_do_not_fit_are_422(running: RunningService, value: bytes, code: str) -> None:
    answer = running.post(PATH, law(value))
    assert answer.status == 422
    assert codes(answer) == [code]


def test_digits_that_only_look_long_are_read(running: RunningService) -> None:
    # long fractions and digits inside text are no long integers
    assert running.post(PATH, law(b"0.1234567890123456789012345")).status == 200
    assert running.post(PATH, law(b"12345678901234567890.5e-19")).status == 200
    answer = running.post(PATH, b'{"distribution":{"family":"12345678901234567890123"},"event":{"below":1}}')
    assert codes(answer) == ["unknown_family"]


@pytest.mark.parametrize("body", [b"[]", b"1", b'"text"', b"null", b"true"])
def test_json_that_is_no_object_is_422(running: RunningService, body: bytes) -> None:
    answer = running.post(PATH, body)
    assert answer.status == 422
    assert codes(answer) == ["not_an_object"]


@pytest.mark.parametrize(
    "headers",
    [
        {"Content-Type": ""},
        {"Content-Type": "text/plain"},
        {"Content-Type": "application/x-www-form-urlencoded"},
        {"Content-Type": "application/json; charset=latin-1"},
        {"Content-Type": "application/json; charset=utf-16"},
        {"Content-Type": "application/jsonx"},
        {"Content-Encoding": "gzip"},
    ],
)
def test_other_media_types_charsets_and_codings_are_415(running: RunningService, headers: dict[str, str]) -> None:
    answer = running.post(PATH, law(b"1"), headers)
    assert answer.status == 415
    assert problem(answer)["type"] == "about:blank"


@pytest.mark.parametrize(
    "kind",
    [
        "application/json; charset=utf-8",
        "application/json;charset=UTF-8",
        'application/json; charset="utf-8"',
        "Application/JSON",
    ],
)
def test_json_in_utf8_is_taken_however_it_is_written(running: RunningService, kind: str) -> None:
    assert running.post(PATH, law(b"1"), {"Content-Type": kind}).status == 200


def chunked(body: bytes, size: int = 10_000) -> bytes:
    parts = [body[i : i + size] for i in range(0, len(body), size)]
    return b"".join(f"{len(part):x}\r\n".encode() + part + b"\r\n" for part in parts) + b"0\r\n\r\n"


HEAD = f"POST {PATH} HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\n".encode()
CHUNKED = HEAD + b"Transfer-Encoding: chunked\r\n\r\n"


def test_a_chunked_body_is_read_whole(running: RunningService) -> None:
    assert running.send(CHUNKED + chunked(law(b"1"), size=7)).status == 200


def test_too_large_a_body_is_413(running: RunningService) -> None:
    answer = running.post(PATH, b" " * 65_537)
    assert answer.status == 413
    assert codes(answer) == ["body_too_large"]


def test_too_large_a_chunked_body_is_413_and_not_cut(running: RunningService) -> None:
    # the part up to the limit would be a question that fits: it must not be answered
    answer = running.send(CHUNKED + chunked(law(b"1") + b" " * 70_000))
    assert answer.status == 413
    assert codes(answer) == ["body_too_large"]


def test_a_body_of_just_the_limit_is_read(running: RunningService) -> None:
    question = law(b"1")
    assert running.post(PATH, question + b" " * (65_536 - len(question))).status == 200


def test_broken_chunks_are_400(running: RunningService) -> None:
    answer = running.send(CHUNKED + b"zz\r\n{}\r\n0\r\n\r\n")
    assert answer.status == 400
    assert problem(answer)["type"] == "/problems/unreadable"


def test_a_body_that_ends_early_is_400(running: RunningService) -> None:
    answer = running.send(HEAD + b"Content-Length: 500\r\n\r\n" + law(b"1")[:-1], half_close=True)
    assert answer.status == 400
    assert problem(answer)["type"] == "/problems/unreadable"


def test_a_long_address_is_414(running: RunningService) -> None:
    answer = running.send(b"GET /v1/probabilities?family=" + b"n" * 9_000 + b" HTTP/1.1\r\nHost: localhost\r\n\r\n")
    assert answer.status == 414
    assert codes(answer) == ["url_too_long"]


@pytest.mark.parametrize(
    "headers", [b"X-Long: " + b"x" * 9_000 + b"\r\n", b"".join(b"X-%d: 1\r\n" % i for i in range(150))]
)
def test_long_or_many_headers_are_431(running: RunningService, headers: bytes) -> None:
    answer = running.send(b"GET /health/live HTTP/1.1\r\nHost: localhost\r\n" + headers + b"\r\n")
    assert answer.status == 431
    assert codes(answer) == ["headers_too_large"]


@pytest.mark.parametrize(
    "message",
    [
        b"GARBAGE\r\n\r\n",
        b"GET / HTTP/9.9\r\n\r\n",
        b"G\x00T / HTTP/1.1\r\n\r\n",
        b"GET / HTTP/1.1\r\nBad Header: 1\r\n\r\n",
        b"GET / HTTP/1.1\r\nContent-Length: x\r\n\r\n",
    ],
)
def test_a_broken_request_line_or_header_is_400(running: RunningService, message: bytes) -> None:
    answer = running.send(message)
    assert answer.status == 400
    assert codes(answer) == ["broken_request"]


def test_an_unknown_transfer_coding_is_501(running: RunningService) -> None:
    answer = running.send(HEAD + b"Transfer-Encoding: sideways\r\n\r\n")
    assert answer.status == 501
    assert problem(answer)["type"] == "about:blank"
