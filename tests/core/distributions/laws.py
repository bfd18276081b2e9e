"""Making laws for tests: by name and numbers, from declared examples, at random around them."""

from collections.abc import Mapping
from typing import Any

from hypothesis import assume
from hypothesis import strategies as st

from service.core.arrays import Numbers
from service.core.declared import Parameterisation
from service.core.distributions import FAMILIES, Family
from service.core.errors import DoesNotFit
from service.core.parameters import Components, Declaration, Parameter


def law(name: str, way: int = 0, **given: Any) -> Family:
    """A law as a client would ask for it: numbers and lists, refused where they do not fit."""
    kind = FAMILIES[name]
    declared = kind.parameterisations[way]
    values = {n: declared.parameters[n].as_numbers(v) for n, v in given.items()}
    refusals = [refusal for n, v in values.items() for refusal in declared.parameters[n].refusals(v)]
    if refusals:
        raise DoesNotFit(refusals)
    return kind.make(declared, values)


def plain(*figures: Numbers | None) -> tuple[float, ...]:
    """Single figures as Python numbers, for comparison."""
    return tuple(float(figure) for figure in figures if figure is not None)


def example_of(kind: type[Family], way: int = 0) -> Family:
    declared = kind.parameterisations[way].parameters
    return law(kind.name, way, **{n: p.example for n, p in declared.items()})


@st.composite
def laws(draw: st.DrawFn, kind: type[Family]) -> Family:
    """A law with parameters around the declared examples, in any way of giving them."""
    declared = kind.parameterisations[draw(st.integers(0, len(kind.parameterisations) - 1))]
    return made(kind, declared, {n: p.as_numbers(draw(values(p))) for n, p in declared.parameters.items()})


def made(kind: type[Family], declared: Parameterisation, given: Mapping[str, Any]) -> Family:
    """The law; a draw that breaks a rule between parameters is drawn again."""
    try:
        return kind.make(declared, given)
    except DoesNotFit:
        assume(False)
        raise


def values(parameter: Declaration) -> st.SearchStrategy[Any]:
    if isinstance(parameter, Parameter):
        return numbers(parameter)
    if isinstance(parameter, Components):
        return components(parameter)
    return st.lists(st.integers(-3, 9), min_size=1, max_size=8)


def numbers(parameter: Parameter) -> st.SearchStrategy[float]:
    """Numbers from a third of the example to three times it and beside it, within the limits."""
    reach = max(abs(parameter.example), 0.1)
    near = st.floats(0.3, 3).map(lambda factor: factor * parameter.example)
    beside = st.floats(-0.9, 1).map(lambda shift: parameter.example + shift * reach)
    either = (near | beside).map(float if not parameter.whole else lambda value: float(round(value)))
    return either.filter(lambda value: not parameter.refusals(value))


@st.composite
def components(draw: st.DrawFn, parameter: Components) -> list[dict[str, float]]:
    count = draw(st.integers(1, 3))
    rows = [{n: draw(numbers(p)) for n, p in parameter.parts.items()} for _ in range(count)]
    total = sum(row[parameter.share] for row in rows)
    return [row | {parameter.share: row[parameter.share] / total} for row in rows]
