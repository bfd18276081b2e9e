"""A family is one class: its declaration is checked when it is made."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import Numbers, number
from service.core.distributions import FAMILIES, Family
from service.core.distributions.family import Moments, Support, Tails
from service.core.errors import DoesNotFit
from service.core.parameters import Order, Parameter
from tests.core.distributions.laws import example_of, law


def whole_body(**changes: Any) -> dict[str, Any]:
    """The body of a complete family class."""

    def form(self: Family, x: Numbers) -> Numbers:
        return x

    body = {
        "__doc__": "Something for tests.",
        "name": "for_tests",
        "support_words": "every number",
        "numerical_error": 1e-15,
        "spread": Parameter("the spread", above=0, example=1),
        **dict.fromkeys(("tails", "density", "quantile", "moments", "most_likely", "entropy", "support"), form),
    }
    return {name: value for name, value in (body | changes).items() if value is not None}


def declare(body: dict[str, Any]) -> type[Family]:
    for name, value in body.items():
        if hasattr(value, "__set_name__"):
            value.__set_name__(object, name)
    return type("ForTests", (Family,), body)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"__doc__": None}, "a docstring and a name"),
        ({"name": None}, "a docstring and a name"),
        ({"name": "normal"}, "declared twice"),
        ({"tails": None}, "are needed"),
        ({"density": None}, "are needed"),
        ({"quantile": None}, "quantile"),
        ({"support": None}, "support"),
        ({"support_words": None}, "support_words"),
        ({"numerical_error": None}, "numerical_error"),
        ({"spread": Parameter("the spread", above=0, example=-1)}, "an example within its limits"),
        ({"spread": Parameter("", above=0, example=1)}, "a meaning"),
    ],
)
def test_a_declaration_that_is_not_whole_is_refused(changes: dict[str, Any], message: str) -> None:
    before = dict(FAMILIES)
    with pytest.raises(TypeError, match=message):
        declare(whole_body(**changes))
    assert before == FAMILIES


def test_an_example_that_breaks_a_rule_is_refused() -> None:
    body = whole_body(
        lower=Parameter("an end", example=2), upper=Parameter("an end", example=1), rules=(Order("lower", "upper"),)
    )
    with pytest.raises(DoesNotFit, match="lower < upper is needed"):
        declare(body)


def test_a_whole_declaration_joins_the_registry() -> None:
    try:
        kind = declare(whole_body())
        assert FAMILIES["for_tests"] is kind
    finally:
        FAMILIES.pop("for_tests", None)


@pytest.mark.parametrize("kind", FAMILIES.values(), ids=str)
def test_declared_examples_work(kind: type[Family]) -> None:
    for way in range(len(kind.parameterisations)):
        made = example_of(kind, way)
        with np.errstate(all="ignore"):
            middle = made.quantile(number(0.5), upper=False)
            assert isinstance(made.tails(middle), Tails)
            assert isinstance(made.moments(), Moments)
            assert isinstance(made.support(), Support)
        assert np.isfinite(middle)


@pytest.mark.parametrize("kind", FAMILIES.values(), ids=str)
def test_the_docstring_opens_with_what_the_family_is_used_for(kind: type[Family]) -> None:
    first = (kind.__doc__ or "").strip().split("\n\n")[0]
    assert first.endswith(".")
    assert len(first) < 260


def test_defaults_are_filled_in() -> None:
    assert (
        law("student_t", degrees_of_freedom=5).moments()
        == law("student_t", degrees_of_freedom=5, location=0, scale=1).moments()
    )


def test_a_class_shows_its_declaration_and_an_instance_its_value() -> None:
    kind: Any = FAMILIES["normal"]
    assert kind.mean.meaning == "the centre"
    assert kind.mean.required
    assert kind.parameterisations[0].lists == frozenset()
    made: Any = kind()
    with pytest.raises(AttributeError, match="made without mean"):
        made.mean  # noqa: B018 - reading it is the test


def test_a_family_without_a_form_of_its_own_says_so() -> None:
    bare: Any = Family.__new__(Family)
    one = np.float64(1)
    calls: list[Any] = [
        lambda: bare.quantile(one, False),
        bare.moments,
        bare.most_likely,
        bare.entropy,
        bare.support,
    ]
    for call in calls:
        with pytest.raises(NotImplementedError):
            call()
