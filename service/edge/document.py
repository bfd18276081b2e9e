"""The OpenAPI document, made of the declarations."""

from collections.abc import Iterable, Mapping
from typing import Any

from apispec import APISpec

from service import __version__
from service.edge.examples import examples
from service.edge.mount import MountedCatalogue, MountedEndpoint
from service.edge.process_paths import PROCESS_PATHS
from service.edge.respond import JSON
from service.edge.responses import ALWAYS, HELD, answered, failures, problem_responses
from service.endpoints.declaration import Catalogue, Endpoint
from service.schemas.fields import StrictField
from service.schemas.json_schema import class_name, closed_object, reference
from service.schemas.question import Question
from service.schemas.shapes import COMPONENTS, COUNT, TAIL, constant, open_object

DESCRIPTION = """Exact, reproducible probability statements for digital investment advice.

Every figure is an estimate under stated assumptions, not advice or a promise; local rules and licensed practice come
first. Figures are unrounded doubles; a figure that has no value is null and explained in null_reasons. The answer is a
pure function of request and version: any request may be sent again."""


def document(endpoints: Iterable[MountedEndpoint], catalogues: Iterable[MountedCatalogue]) -> dict[str, Any]:
    """Make the document of these endpoints, with the limits that they run with."""
    spec = APISpec("Chance service", __version__, "3.1.0", info={"description": DESCRIPTION}, servers=[{"url": "/"}])
    components: dict[str, Any] = dict(COMPONENTS)
    parameters: dict[str, Any] = {}
    for mounted in endpoints:
        spec.path(mounted.path, operations=_operations(mounted, components, parameters))
    for listed in catalogues:
        spec.path(listed.declared.path, operations={"get": _read_operation(listed.declared, components)})
    for path, operations in PROCESS_PATHS.items():
        spec.path(path, operations=operations)
    out: dict[str, Any] = spec.to_dict()
    out["components"] = {
        "schemas": dict(sorted(components.items())),
        "parameters": dict(sorted(parameters.items())),
        "responses": problem_responses(),
    }
    return out


def _operations(mounted: MountedEndpoint, components: dict[str, Any], parameters: dict[str, Any]) -> dict[str, Any]:
    declared = mounted.declared
    one, many = _answers(declared, components)
    asked, answered_so = examples(mounted)
    schema = _request(declared, mounted.question, components)
    answers = _choice(f"{declared.name}PostResult", [*one, *many], components)
    post = _operation(declared, "post", answers, (400, 413, 415, 422, *ALWAYS))
    post["requestBody"] = {"required": True, "content": {JSON: {"schema": schema, "examples": asked}}}
    post["responses"]["200"]["content"][JSON]["examples"] = answered_so
    if mounted.query is None:
        return {"post": post}
    get = _operation(declared, "get", _choice(f"{declared.name}Result", one, components), (400, 422, *ALWAYS))
    get["parameters"] = _query_parameters(mounted, parameters)
    get["responses"] |= HELD
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
        way = "By" + "And".join(map(class_name, told_by)) if told_by else ""
        name = f"{declared.name}{way}Question"
        members = {n: fields[n].printed(components) for n in own}
        optional = [n for n in members if not fields[n].required and n not in told_by]
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


def _operation(declared: Endpoint, verb: str, answer: Mapping[str, Any], statuses: Iterable[int]) -> dict[str, Any]:
    summary = (declared.compute.__doc__ or "").strip()
    return {
        "operationId": f"{verb}_{declared.compute.__name__}",
        "summary": summary,
        "responses": {"200": answered(answer, cached=verb == "get")} | failures(statuses),
    }


def _query_parameters(mounted: MountedEndpoint, parameters: dict[str, Any]) -> list[str]:
    """Print every name of the flat query once, in `parameters`; lists are comma-separated."""
    names = []
    for field_name, field in mounted.question.fields.items():
        assert isinstance(field, StrictField)  # noqa: S101 - questions have no other fields
        for name, meaning, schema in field.flat(field_name):
            parameters[name] = {
                "name": name,
                "in": "query",
                "style": "form",
                "explode": False,
                "description": meaning,
                "required": name == "family",
                "schema": schema,
            }
            names.append(name)
    return names  # apispec turns a name into a reference to the component


def _read_operation(declared: Catalogue, components: dict[str, Any]) -> dict[str, Any]:
    components[declared.name] = dict(declared.schema)
    parameters = [
        {"name": name, "in": "path", "required": True, "schema": {"type": "string", "enum": values}}
        for name, values in declared.parameters.items()
    ]
    statuses = [status for status in ALWAYS if status != 404 or parameters]
    operation = {
        "operationId": f"get_{declared.read.__name__}",
        "summary": (declared.read.__doc__ or "").strip(),
        "responses": {
            "200": answered(reference(declared.name), cached=True),
            **HELD,
            **failures([422, *statuses]),
        },
    }
    return operation | ({"parameters": parameters} if parameters else {})
