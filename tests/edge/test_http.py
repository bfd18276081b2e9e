"""Methods, negotiation, caching, cross-origin calls: HTTP as its standards have it (RFC 9110, RFC 9111, Fetch)."""

import hashlib
import re

import pytest

from service.edge.app import create_app
from service.edge.settings import Settings
from tests.conftest import Asker

ADDRESS = "/v1/probabilities?family=normal&mean=10&standard_deviation=2&below=11"
QUESTION = {"distribution": {"family": "normal", "mean": 10, "standard_deviation": 2}, "event": {"below": 11}}


def test_get_is_cacheable_and_post_is_not(ask: Asker) -> None:
    got = ask.get(ADDRESS)
    assert got.headers["Cache-Control"] == "public, max-age=3600"
    assert re.fullmatch(r'"[0-9a-f]{32}"', got.headers["ETag"])
    assert "Accept" in got.headers["Vary"]
    posted = ask.client.post("/v1/probabilities", json=QUESTION)
    assert posted.headers["Cache-Control"] == "no-store"
    assert "ETag" not in posted.headers


@pytest.mark.parametrize("form", ["{}", "W/{}", '"other", {}', "*"])
def test_a_held_answer_is_304_without_a_body(ask: Asker, form: str) -> None:
    tag = ask.get(ADDRESS).headers["ETag"]
    again = ask.get(ADDRESS, If_None_Match=form.format(tag))
    assert again.status_code == 304
    assert again.get_data() == b""
    assert again.headers["ETag"] == tag
    assert again.headers["Cache-Control"] == "public, max-age=3600"


def test_304_is_answered_before_any_computation(ask: Asker) -> None:
    # the question does not fit, but whoever holds an answer under its tag is not told so
    bad = ADDRESS.replace("mean=10", "mean=ten")
    assert ask.get(bad).status_code == 422
    assert ask.get(bad, If_None_Match="*").status_code == 304


def test_another_tag_is_answered_in_full(ask: Asker) -> None:
    assert ask.get(ADDRESS, If_None_Match='"stale"').status_code == 200


def test_different_questions_have_different_tags(ask: Asker) -> None:
    assert ask.get(ADDRESS).headers["ETag"] != ask.get(ADDRESS + "&above=9").headers["ETag"]


def test_head_has_the_headers_of_get_and_no_body(ask: Asker) -> None:
    got, head = ask.get(ADDRESS), ask.client.head(ADDRESS)
    assert head.status_code == 200
    assert head.get_data() == b""
    for name in ("ETag", "Content-Length", "Content-Type", "Cache-Control"):
        assert head.headers[name] == got.headers[name]


@pytest.mark.parametrize(
    ("path", "allow"),
    [
        ("/v1/probabilities", "GET, HEAD, OPTIONS, POST"),
        ("/v1/rankings", "OPTIONS, POST"),
        ("/v1/codes", "GET, HEAD, OPTIONS"),
        ("/health/live", "GET, HEAD, OPTIONS"),
        ("/openapi.json", "GET, HEAD, OPTIONS"),
        ("/problems/unreadable", "GET, HEAD, OPTIONS"),
    ],
)
def test_options_and_405_name_the_methods(ask: Asker, path: str, allow: str) -> None:
    options = ask.client.options(path)
    assert (options.status_code, options.headers["Allow"], options.get_data()) == (204, allow, b"")
    refused = ask.client.delete(path)
    assert (refused.status_code, refused.headers["Allow"]) == (405, allow)
    assert refused.content_type == "application/problem+json"


def test_a_method_that_an_address_lacks_is_405(ask: Asker) -> None:
    assert ask.get("/v1/rankings").status_code == 405
    assert ask.client.post("/v1/codes", json={}).status_code == 405


@pytest.mark.parametrize(
    "path",
    [
        "/nothing",
        "/v1",
        "/v1/probabilities/",
        "//v1/probabilities",
        "/v1/distributions/none",
        "/problems/none",
        "/health/other",
        "/v1/distributions/",
    ],
)
def test_an_unknown_address_is_404(ask: Asker, path: str) -> None:
    response = ask.get(path)
    assert response.status_code == 404
    assert response.content_type == "application/problem+json"
    assert response.get_json()["type"] == "about:blank"


@pytest.mark.parametrize("accept", ["application/json", "*/*", "application/*", "text/html, application/json;q=0.5"])
def test_json_is_given_to_who_accepts_it(ask: Asker, accept: str) -> None:
    assert ask.get(ADDRESS, Accept=accept).content_type == "application/json"


@pytest.mark.parametrize("accept", ["text/html", "image/png", "application/json;q=0"])
def test_other_formats_are_406_and_the_problem_still_comes(ask: Asker, accept: str) -> None:
    response = ask.get(ADDRESS, Accept=accept)
    assert response.status_code == 406
    assert response.content_type == "application/problem+json"


def test_every_answer_has_a_request_id_of_its_own(ask: Asker) -> None:
    addresses = [ADDRESS, ADDRESS, "/nothing", "/v1/codes", "/health/live"]
    ids = [ask.get(address).headers["Request-Id"] for address in addresses]
    assert all(re.fullmatch(r"[0-9a-f]{32}", each) for each in ids)
    assert len(set(ids)) == len(ids)


def test_the_fingerprint_can_be_recomputed(ask: Asker) -> None:
    body = b'{"distribution":{"family":"normal","mean":10, "standard_deviation":2},"event":{"below":11}}'
    posted = ask.client.post("/v1/probabilities", data=body, content_type="application/json").get_json()
    expected = hashlib.sha256(b"/v1/probabilities\n" + body).hexdigest()
    assert posted["basis"]["request_fingerprint"] == f"sha256:{expected}"
    got = ask.get(ADDRESS).get_json()
    assert got["basis"]["request_fingerprint"] == f"sha256:{hashlib.sha256(ADDRESS.encode()).hexdigest()}"


def test_the_same_question_gets_the_same_bytes(ask: Asker) -> None:
    assert ask.get(ADDRESS).get_data() == ask.get(ADDRESS).get_data()


def test_without_allowed_origins_no_page_may_call(ask: Asker) -> None:
    response = ask.get(ADDRESS, Origin="https://app.example")
    assert not [name for name, _ in response.headers if name.startswith("Access-Control")]


class TestAllowedOrigins:
    client = create_app(Settings(allowed_origins=("https://app.example",))).test_client()

    def test_an_allowed_page_may_read_the_answer_and_its_headers(self) -> None:
        response = self.client.get(ADDRESS, headers={"Origin": "https://app.example"})
        assert response.headers["Access-Control-Allow-Origin"] == "https://app.example"
        assert response.headers["Access-Control-Expose-Headers"] == "ETag, Retry-After, Request-Id"
        assert "Origin" in response.headers["Vary"]

    def test_problems_can_be_read_by_the_page_too(self) -> None:
        response = self.client.post("/v1/probabilities", json={}, headers={"Origin": "https://app.example"})
        assert response.status_code == 422
        assert response.headers["Access-Control-Allow-Origin"] == "https://app.example"

    def test_another_page_may_not(self) -> None:
        response = self.client.get(ADDRESS, headers={"Origin": "https://other.example"})
        assert "Access-Control-Allow-Origin" not in response.headers

    def test_the_preflight_is_answered(self) -> None:
        asks = {
            "Origin": "https://app.example",
            "Access-Control-Request-Method": "POST",
            "Access-Control-Request-Headers": "content-type",
        }
        response = self.client.options("/v1/rankings", headers=asks)
        assert response.status_code == 204
        assert "POST" in response.headers["Access-Control-Allow-Methods"]
        assert "Content-Type" in response.headers["Access-Control-Allow-Headers"]
        assert int(response.headers["Access-Control-Max-Age"]) > 0

    def test_the_preflight_of_another_page_allows_nothing(self) -> None:
        asks = {"Origin": "https://other.example", "Access-Control-Request-Method": "POST"}
        response = self.client.options("/v1/rankings", headers=asks)
        assert response.status_code == 204
        assert not [name for name, _ in response.headers if name.startswith("Access-Control")]

    def test_any_origin_can_be_allowed(self) -> None:
        client = create_app(Settings(allowed_origins=("*",))).test_client()
        response = client.get(ADDRESS, headers={"Origin": "https://app.example"})
        assert response.headers["Access-Control-Allow-Origin"] == "*"


def test_a_failure_inside_is_a_500_that_tells_nothing() -> None:
    app = create_app()

    @app.get("/fails")
    def fails() -> str:
        return str(1 / 0)

    response = app.test_client().get("/fails")
    assert response.status_code == 500
    assert response.content_type == "application/problem+json"
    assert "ZeroDivision" not in response.get_data(as_text=True)


@pytest.mark.parametrize("name", ["unreadable", "does-not-fit", "too-large", "url-too-long", "headers-too-large"])
def test_every_problem_has_a_page(ask: Asker, name: str) -> None:
    page = ask.get(f"/problems/{name}", Accept="text/html,application/xhtml+xml,*/*;q=0.8")
    assert page.status_code == 200
    assert page.content_type.startswith("text/html")
    assert page.headers["Content-Security-Policy"].startswith("default-src 'none'")
    plain = ask.get(f"/problems/{name}").get_json()
    assert plain["type"] == f"/problems/{name}"
    assert plain["title"] in page.get_data(as_text=True)
    assert ask.get(f"/problems/{name}", If_None_Match=ask.get(f"/problems/{name}").headers["ETag"]).status_code == 304


@pytest.mark.parametrize("probe", ["live", "ready"])
def test_health_is_told_and_never_kept(ask: Asker, probe: str) -> None:
    response = ask.get(f"/health/{probe}")
    assert response.get_json() == {"status": probe}
    assert response.headers["Cache-Control"] == "no-store"
