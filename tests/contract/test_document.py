"""openapi.yaml: valid, in step with the code, described throughout, its examples true."""

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import orjson
import pytest
import yaml
from openapi_spec_validator import validate

from service.edge.app import create_app, default_document
from service.edge.examples import as_plain, rounded
from service.edge.operations.process import print_yaml
from service.edge.settings import Settings
from tests.conftest import Asker

COMMITTED = Path(__file__).parent.parent.parent / "openapi.yaml"
DOCUMENT: dict[str, Any] = yaml.load(COMMITTED.read_text(), Loader=yaml.CSafeLoader)
OPERATIONS = {(verb, path): operation for path, verbs in DOCUMENT["paths"].items() for verb, operation in verbs.items()}


def test_the_committed_document_is_in_step() -> None:
    written = print_yaml(default_document()).decode()
    assert COMMITTED.read_text() == written, "run: python -m tests.contract.write_openapi"


def test_the_document_is_valid_openapi() -> None:
    validate(DOCUMENT)
    assert DOCUMENT["openapi"].startswith("3.1")


def test_the_service_gives_the_same_document(ask: Asker) -> None:
    assert ask.get("/openapi.yaml").get_data(as_text=True) == COMMITTED.read_text()
    assert ask.get("/openapi.json").get_json() == DOCUMENT
    tag = ask.get("/openapi.json").headers["ETag"]
    assert ask.get("/openapi.json", If_None_Match=tag).status_code == 304


def test_json_shows_the_running_limits_and_yaml_the_defaults() -> None:
    client = create_app(Settings(max_questions=7)).test_client()
    batch = client.get("/openapi.json").get_json()["components"]["schemas"]["ProbabilityBatch"]
    assert batch["properties"]["questions"]["maxItems"] == 7
    assert client.get("/openapi.yaml").get_data(as_text=True) == COMMITTED.read_text()


def test_every_operation_has_a_name_of_its_own() -> None:
    names = [operation["operationId"] for operation in OPERATIONS.values()]
    assert len(set(names)) == len(names)
    assert all(re.fullmatch(r"[a-z_]+", name) for name in names)


@pytest.mark.parametrize(("verb", "path"), OPERATIONS)
def test_every_operation_describes_its_errors(verb: str, path: str) -> None:
    responses = OPERATIONS[verb, path]["responses"]
    expected = {"200", "405", "406", "500", "503"}
    if verb == "post":
        expected |= {"400", "413", "415", "422"}
    if path.startswith("/v1/"):
        expected |= {"422"}
    assert expected <= responses.keys()
    for status, referred in responses.items():
        if int(status) >= 400:
            response = DOCUMENT["components"]["responses"][referred["$ref"].rsplit("/", 1)[1]]
            assert response["content"].keys() == {"application/problem+json"}
            assert response["description"]


EXAMPLES = [
    (path, name)
    for (verb, path), operation in OPERATIONS.items()
    if verb == "post"
    for name in operation["requestBody"]["content"]["application/json"]["examples"]
]


@pytest.mark.parametrize(("path", "name"), EXAMPLES)
def test_every_example_answers_as_printed(ask: Asker, path: str, name: str) -> None:
    operation = OPERATIONS["post", path]
    question = operation["requestBody"]["content"]["application/json"]["examples"][name]["value"]
    printed = operation["responses"]["200"]["content"]["application/json"]["examples"][name]["value"]
    response = ask.client.post(path, data=orjson.dumps(question), content_type="application/json")
    assert response.status_code == 200
    assert rounded(as_plain(response.get_json())) == printed


def test_every_computed_operation_has_an_example() -> None:
    assert {path for path, _ in EXAMPLES} == {path for verb, path in OPERATIONS if verb == "post"}


def objects(node: Any) -> Iterator[dict[str, Any]]:
    if isinstance(node, dict):
        yield node
        for inner in node.values():
            yield from objects(inner)
    elif isinstance(node, list):
        for inner in node:
            yield from objects(inner)


def test_types_can_be_generated_from_the_document() -> None:
    # discriminator objects and defaults come out wrong in generated types
    for node in objects(DOCUMENT["components"]["schemas"]):
        assert "discriminator" not in node
        assert not ("default" in node and "type" in node), node
        if node.get("type") == "object":
            assert "properties" in node or "additionalProperties" in node


def test_requests_are_closed_and_answers_open() -> None:
    for name, component in DOCUMENT["components"]["schemas"].items():
        if component.get("type") == "object":
            is_request = name in ("Assets", "Event") or name.startswith("Portfolio")
            is_request |= bool(re.search("(Question|Batch|Distribution|Returns|Columns)($|By|Matched)", name))
            assert (component.get("additionalProperties") is False) == is_request, name


def test_every_reference_leads_somewhere() -> None:
    for node in objects(DOCUMENT):
        if "$ref" in node:
            _, _, kind, name = node["$ref"].split("/")
            assert name in DOCUMENT["components"][kind]
