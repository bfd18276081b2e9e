"""The OpenAPI document, made of the declarations."""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from apispec import APISpec

from service import __version__
from service.edge.mount import MountedCatalogue, MountedEndpoint
from service.edge.problems import KINDS, MEDIA_TYPE
from service.endpoints.declaration import Catalogue, Endpoint
from service.schemas.fields import StrictField, class_name, closed_object, reference
from service.schemas.question import Question
from service.schemas.shapes import COMPONENTS, COUNT, TAIL, constant, open_object

JSON = "application/json"
DESCRIPTION = """Exact, reproducible probability statements for digital investment advice.

Every figure is an estimate under stated assumptions, not advice or a promise; local rules and licensed practice come
first. Figures are unrounded doubles; a figure that has no value is null and explained in null_reasons. The answer is a
pure function of request and version: any request may be sent again."""
BARE = {
    404: "There is nothing at this address.",
    405: "The address does not take this method.",
    406: "The answer is not offered in the accepted format.",
    415: "The body is not JSON in UTF-8.",
}
FAILED = {
    500: "The service failed; nothing a client sends should lead here.",
    503: "The service is stopping, full or out of time; try again after Retry-After.",
}
ALWAYS = (404, 405, 406, 414, 431, 500, 503)


def document(endpoints: Iterable[MountedEndpoint], catalogues: Iterable[MountedCatalogue]) -> dict[str, Any]:
    """Make the document of these endpoints, with the limits that they run with."""
    spec = APISpec("Chance service", __version__, "3.1.0", info={"description": DESCRIPTION}, servers=[{"url": "/"}])
    components: dict[str, Any] = dict(COMPONENTS)
    for mounted in endpoints:
        spec.path(mounted.path, operations=_operations(mounted, components))
    for listed in catalogues:
        spec.path(listed.declared.path, operations={"get": _read_operation(listed.declared, components)})
    for path, operations in PROCESS_PATHS.items():
        spec.path(path, operations=operations)
    out: dict[str, Any] = spec.to_dict()
    out["components"] = {"schemas": dict(sorted(components.items()))}
    return out


def _operations(mounted: MountedEndpoint, components: dict[str, Any]) -> dict[str, Any]:
    declared = mounted.declared
    one, many = _answers(declared, components)
    body = {
        "required": True,
        "content": {
            JSON: {
                "schema": _request(declared, mounted.question, components),
                "examples": {
                    title.replace(" ", "_"): {"summary": title, "value": value}
                    for title, value in declared.examples.items()
                },
            }
        },
    }
    answers = _choice(f"{declared.name}PostResult", [*one, *many], components)
    post = _operation(declared, "post", answers, (400, 413, 415, 422, *ALWAYS)) | {"requestBody": body}
    if mounted.query is None:
        return {"post": post}
    get = _operation(declared, "get", _choice(f"{declared.name}Result", one, components), (400, 422, *ALWAYS))
    get["parameters"] = _query_parameters(mounted)
    get["responses"]["304"] = {"description": "The client holds this answer already."}
    return {"post": post, "get": get}


def _request(declared: Endpoint, question: Question, components: dict[str, Any]) -> dict[str, str]:
    """One question or a batch of them."""
    names = _question_components(declared, question, components)
    if not declared.batch:
        return _choice(f"{declared.name}Request", names, components)
    batch = f"{declared.name}Batch"
    questions = {
        "type": "array",
        "minItems": 1,
        "maxItems": question.service_limits.questions,
        "items": _choice(f"{declared.name}Question", names, components),
    }
    components[batch] = closed_object({"questions": questions}, never=question.fields)
    return _choice(f"{declared.name}Request", [*names, batch], components)


def _question_components(declared: Endpoint, question: Question, components: dict[str, Any]) -> list[str]:
    """Print one object for each way to ask."""
    fields: dict[str, StrictField] = dict(question.fields)  # type: ignore[arg-type]
    others = [*fields, *(["questions"] if declared.batch else [])]
    names = []
    for told_by, own in question.ways().items():
        name = f"{declared.name}{'By' + class_name(told_by) if told_by else ''}Question"
        members = {n: fields[n].printed(components) for n in own}
        optional = [n for n in members if not fields[n].required and n != told_by]
        components[name] = closed_object(
            members, optional=optional, never=others, description=(type(question).__doc__ or "").strip()
        )
        names.append(name)
    return names


def _choice(name: str, names: list[str], components: dict[str, Any]) -> dict[str, str]:
    """Refer to one component, or to the union of several under a name of its own."""
    if len(names) == 1:
        return reference(names[0])
    components[name] = {"oneOf": [reference(n) for n in names]}
    return reference(name)


def _answers(declared: Endpoint, components: dict[str, Any]) -> tuple[list[str], list[str]]:
    """Print the answers in each form; give the names of those to one question, and of the batch."""
    shapes = {name: shape for answer in declared.answers for name, shape in answer.components().items()}
    components.update(shapes)
    if not declared.batch:
        return list(shapes), []
    batch = f"{declared.name}BatchAnswer"
    items = {"oneOf": [reference(name) for name in shapes]}
    components[batch] = open_object(
        {
            "form": constant("batch"),
            "length": COUNT,
            "answers": {"type": "array", "items": items},
            "basis": TAIL["basis"],
            "cautions": TAIL["cautions"],
        }
    )
    return list(shapes), [batch]


def _operation(declared: Endpoint, verb: str, answer: Mapping[str, Any], failures: Iterable[int]) -> dict[str, Any]:
    summary = (declared.compute.__doc__ or "").strip()
    return {
        "operationId": f"{verb}_{declared.compute.__name__}",
        "summary": summary,
        "responses": {"200": answered(answer, cached=verb == "get")} | _failures(failures),
    }


def answered(schema: Mapping[str, Any], *, cached: bool, media: str = JSON) -> dict[str, Any]:
    """Describe a success."""
    headers = {"Request-Id": TEXT_HEADER} | ({"ETag": TEXT_HEADER, "Cache-Control": TEXT_HEADER} if cached else {})
    return {"description": "The answer.", "headers": headers, "content": {media: {"schema": dict(schema)}}}


TEXT_HEADER = {"schema": {"type": "string"}}
MEANINGS = BARE | FAILED | {kind.status: kind.meaning for kind in KINDS.values()}


def _failures(statuses: Iterable[int]) -> dict[str, Any]:
    problem = {"content": {MEDIA_TYPE: {"schema": reference("Problem")}}, "headers": {"Request-Id": TEXT_HEADER}}
    return {str(status): {"description": MEANINGS[status], **problem} for status in sorted(statuses)}


def _query_parameters(mounted: MountedEndpoint) -> list[dict[str, Any]]:
    """Print every name of the flat query once; lists are comma-separated."""
    assert mounted.query is not None  # noqa: S101 - only called for questions that take GET
    parameters = []
    for name, meaning, schema in flat_names(mounted.question):
        parameters.append(
            {
                "name": name,
                "in": "query",
                "style": "form",
                "explode": False,
                "description": meaning,
                "required": name == "family",
                "schema": schema,
            }
        )
    return parameters


def flat_names(question: Question) -> Iterator[tuple[str, str, dict[str, Any]]]:
    """Give every name of a flat query with its meaning and schema."""
    for name, field in question.fields.items():
        assert isinstance(field, StrictField)  # noqa: S101 - questions have no other fields
        yield from field.flat(name)


def _read_operation(declared: Catalogue, components: dict[str, Any]) -> dict[str, Any]:
    components[declared.name] = dict(declared.schema)
    parameters = [
        {"name": name, "in": "path", "required": True, "schema": {"type": "string", "enum": values}}
        for name, values in declared.parameters.items()
    ]
    failures = [status for status in ALWAYS if status != 404 or parameters]
    operation = {
        "operationId": f"get_{declared.read.__name__}",
        "summary": (declared.read.__doc__ or "").strip(),
        "responses": {
            "200": answered(reference(declared.name), cached=True),
            "304": {"description": "The client holds this answer already."},
            **_failures([422, *failures]),
        },
    }
    return operation | ({"parameters": parameters} if parameters else {})


def _process_operation(
    name: str,
    summary: str,
    schema: Mapping[str, Any],
    media: str = JSON,
    *,
    cached: bool = True,
    parameters: Mapping[str, list[str]] | None = None,
) -> dict[str, Any]:
    """Describe an address about the process itself."""
    operation: dict[str, Any] = {
        "operationId": name,
        "summary": summary,
        "responses": {"200": answered(schema, cached=cached, media=media)},
    }
    if cached:
        operation["responses"]["304"] = {"description": "The client holds this answer already."}
    if parameters:
        operation["parameters"] = [
            {"name": n, "in": "path", "required": True, "schema": {"type": "string", "enum": v}}
            for n, v in parameters.items()
        ]
    operation["responses"] |= _failures([s for s in ALWAYS if s != 404 or parameters])
    return {"get": operation}


ANY_OBJECT = {"type": "object", "additionalProperties": True}
STATUS = open_object({"status": {"type": "string"}})
PROCESS_PATHS = {
    "/health/live": _process_operation("get_health_live", "Does the process answer?", STATUS, cached=False),
    "/health/ready": _process_operation("get_health_ready", "Does the process take requests?", STATUS, cached=False),
    "/openapi.json": _process_operation("get_openapi_json", "This document, with the running limits.", ANY_OBJECT),
    "/openapi.yaml": _process_operation(
        "get_openapi_yaml", "This document, with the default limits.", {"type": "string"}, "application/yaml"
    ),
    "/problems/{name}": _process_operation(
        "get_problem",
        "What a kind of problem means and how to mend it.",
        open_object(
            {
                "type": {"type": "string"},
                "title": {"type": "string"},
                "status": COUNT,
                "meaning": {"type": "string"},
                "remedy": {"type": "string"},
            }
        ),
        parameters={"name": sorted(KINDS)},
    ),
}
