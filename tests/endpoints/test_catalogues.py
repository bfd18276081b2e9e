"""What the catalogues list, and that it is what the service does."""

import jsonschema
import pytest

from service.core.distributions import FAMILIES
from service.core.portfolio.criteria import CRITERIA
from service.core.returns import RETURN_MODELS
from tests.conftest import Asker


def test_every_family_is_listed_with_its_use(ask: Asker) -> None:
    listed = ask.get("/v1/distributions").get_json()["distributions"]
    assert [entry["family"] for entry in listed] == sorted(FAMILIES)
    assert all(entry["used_for"].endswith(".") and entry["support"] for entry in listed)


@pytest.mark.parametrize("family", FAMILIES)
def test_a_family_is_described_so_that_a_client_can_ask(ask: Asker, family: str) -> None:
    entry = ask.get(f"/v1/distributions/{family}").get_json()
    example = entry["example"]
    jsonschema.Draft202012Validator(entry["json_schema"]).validate(example)
    answer = ask.answer("/v1/moments", {"distribution": example})
    assert answer["basis"]["method"] == entry["quantile_method"]
    for way in entry["parameterisations"]:
        for parameter in way["parameters"]:
            assert parameter["meaning"]
            assert parameter["limits"].keys() == {"above", "at_least", "below", "at_most"}


@pytest.mark.parametrize("family", FAMILIES)
def test_every_limit_in_the_catalogue_is_kept(ask: Asker, family: str) -> None:
    entry = ask.get(f"/v1/distributions/{family}").get_json()
    for way in entry["parameterisations"]:
        example = {"family": family} | {p["name"]: p["example"] for p in way["parameters"]}
        for parameter in way["parameters"]:
            limits = parameter["limits"]
            beyond = {
                "above": limits["above"],
                "below": limits["below"],
                "at_least": None if limits["at_least"] is None else limits["at_least"] - 1,
                "at_most": None if limits["at_most"] is None else limits["at_most"] + 1,
            }
            for relation, value in beyond.items():
                if value is not None and abs(value) < 2**53 and not parameter["list"]:
                    question = {"distribution": example | {parameter["name"]: value}}
                    assert f"/distribution/{parameter['name']}" in ask.faults("/v1/moments", question), relation


def test_no_family_takes_a_name_that_the_queries_need(ask: Asker) -> None:
    reserved = {
        "above",
        "at_least",
        "below",
        "at_most",
        "exactly",
        "within_standard_deviations",
        "probability",
        "tail",
        "coverage",
        "curve",
        "points",
        "picture",
        "width",
        "height",
        "title",
        "theme",
        "family",
        "distribution",
        "event",
        "questions",
    }
    for family in FAMILIES.values():
        for way in family.parameterisations:
            assert not reserved & way.parameters.keys(), family.name


def test_a_name_is_a_list_in_every_family_or_in_none() -> None:
    kinds: dict[str, set[bool]] = {}
    for family in FAMILIES.values():
        for way in family.parameterisations:
            for name in way.parameters:
                kinds.setdefault(name, set()).add(name in way.lists)
    assert all(len(found) == 1 for found in kinds.values())


def test_return_models_and_criteria_are_listed(ask: Asker) -> None:
    models = ask.get("/v1/return-models").get_json()["return_models"]
    assert [model["name"] for model in models] == sorted(RETURN_MODELS)
    listed = ask.get("/v1/criteria").get_json()["criteria"]
    assert [criterion["name"] for criterion in listed] == list(CRITERIA)
    assert all(criterion["source"] and criterion["better"] in ("higher", "lower") for criterion in listed)


def test_codes_are_listed_once_each_with_their_meaning(ask: Asker) -> None:
    codes = ask.get("/v1/codes").get_json()["codes"]
    pairs = [(entry["kind"], entry["code"]) for entry in codes]
    assert len(set(pairs)) == len(pairs)
    assert all(entry["meaning"].endswith(".") for entry in codes)
    assert {kind for kind, _ in pairs} == {"fault", "caution", "null_reason", "method"}


def test_every_method_in_use_is_listed(ask: Asker) -> None:
    listed = {e["code"] for e in ask.get("/v1/codes").get_json()["codes"] if e["kind"] == "method"}
    used = {method for family in FAMILIES.values() for method in (family.method, family.quantile_method)}
    assert used <= listed


def test_catalogues_are_cached_and_carry_no_basis(ask: Asker) -> None:
    response = ask.get("/v1/distributions")
    assert "basis" not in response.get_json()
    assert ask.get("/v1/distributions", If_None_Match=response.headers["ETag"]).status_code == 304
