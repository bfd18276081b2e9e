"""Parameters as declarations: meaning, limits and example stand once; checks, schema and catalogue follow."""

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Protocol, TypeAlias, overload

import numpy as np

from service.core.arrays import Numbers, Truths
from service.core.errors import Refusal

Comparison: TypeAlias = Callable[[Any, Any], Any]
RELATIONS: dict[str, tuple[str, Comparison]] = {
    "above": ("above", lambda value, bound: value > bound),
    "at_least": ("at least", lambda value, bound: value >= bound),
    "below": ("below", lambda value, bound: value < bound),
    "at_most": ("at most", lambda value, bound: value <= bound),
}
ZERO_CODES = {"above": "must_be_positive", "at_least": "must_not_be_negative"}
ZERO_WORDS = {"above": "above 0", "at_least": "0 or more"}


@dataclass(frozen=True, slots=True)
class Limit:
    """One bound of a parameter: the check, its code and its words cannot disagree."""

    relation: str
    bound: float

    def refusal(self, name: str, value: float | Numbers) -> Refusal | None:
        """Give the first entry of `value` (a float or an array) that breaks the limit, or None."""
        holds = RELATIONS[self.relation][1](value, self.bound)
        if holds is True or (holds is not False and holds.all()):
            return None
        at = (int(np.argmin(holds)),) if np.ndim(value) else ()
        given = float(np.asarray(value)[at])
        return Refusal(
            (name, *at),
            self.code,
            f"{name} must be {self.words}; it is {given:.15g}.",
            {self.relation: self.bound, "given": given},
        )

    @property
    def code(self) -> str:
        """The fault's code: a limit of zero has a name of its own."""
        general = f"must_be_{self.relation}"
        return ZERO_CODES.get(self.relation, general) if self.bound == 0 else general

    @property
    def words(self) -> str:
        """The limit in words, as in "volatility must be 0 or more"."""
        if self.bound == 0 and self.relation in ZERO_WORDS:
            return ZERO_WORDS[self.relation]
        return f"{RELATIONS[self.relation][0]} {self.bound:.15g}"


class Declaration:
    """What every kind of parameter has: a name (given by its class), a meaning, an example, perhaps a default."""

    def __init__(self, meaning: str, *, example: Any, default: Any = None) -> None:
        self.name = ""
        self.meaning = meaning
        self.example = example
        self.default = default

    def __set_name__(self, owner: type, name: str) -> None:
        self.name = name

    @overload
    def __get__(self, instance: None, owner: type) -> "Declaration": ...
    @overload
    def __get__(self, instance: object, owner: type) -> Numbers: ...
    def __get__(self, instance: object | None, owner: type) -> "Declaration | Numbers":
        """Read from the class: the declaration. An instance holds the value itself, which Python finds first."""
        if instance is None:
            return self
        raise AttributeError(f"{owner.__name__} was made without {self.name}")

    @property
    def required(self) -> bool:
        """Whether a question has to give it."""
        return self.default is None

    def as_numbers(self, given: Any) -> Numbers:
        """Turn what a client gives (a number, a list) into what the class holds."""
        return np.asarray(given, np.float64)[()]

    def refusals(self, value: Any) -> list[Refusal]:
        """Give the first broken limit, if any. `value`: a float or a float64 array, finite."""
        raise NotImplementedError


class Parameter(Declaration):
    """A number, or an array of them of the question's length."""

    def __init__(
        self,
        meaning: str,
        *,
        example: float,
        default: float | None = None,
        whole: bool = False,
        above: float | None = None,
        at_least: float | None = None,
        below: float | None = None,
        at_most: float | None = None,
    ) -> None:
        super().__init__(meaning, example=example, default=default)
        self.whole = whole
        given = {"above": above, "at_least": at_least, "below": below, "at_most": at_most}
        self.limits = tuple(Limit(relation, bound) for relation, bound in given.items() if bound is not None)

    def refusals(self, value: float | Numbers) -> list[Refusal]:  # noqa: D102 - as described in Declaration
        for limit in self.limits:
            found = limit.refusal(self.name, value)
            if found is not None:
                return [found]
        return []


REACH = 1e150
"""How far a location or a scale may go: beyond, its square would leave the doubles."""


def anywhere(meaning: str, *, example: float, default: float | None = None) -> Parameter:
    """Declare a place on the line."""
    return Parameter(meaning, example=example, default=default, at_least=-REACH, at_most=REACH)


def positive(
    meaning: str, *, example: float, default: float | None = None, at_least: float = 1 / REACH, at_most: float = REACH
) -> Parameter:
    """Declare a number above 0: a scale, a rate, a shape within its tested range."""
    return Parameter(meaning, example=example, default=default, above=0, at_least=at_least, at_most=at_most)


SHARE_TOLERANCE = 1e-9


class Sample(Declaration):
    """A list of numbers that belong together, such as observations: it does not stretch to the question's length."""

    def __init__(self, meaning: str, *, example: list[float], least_count: int = 1) -> None:
        super().__init__(meaning, example=example)
        self.least_count = least_count

    def refusals(self, value: Numbers) -> list[Refusal]:  # noqa: D102 - as described in Declaration
        if value.size >= self.least_count:
            return []
        return [
            Refusal(
                (self.name,),
                "too_few",
                f"{self.name} needs {self.least_count} entries or more.",
                {"at_least": self.least_count, "given": int(value.size)},
            )
        ]


class Components(Declaration):
    """A list of parts with parameters of their own, such as the components of a mixture; it does not stretch either.

    Its value is an array with a row for each part and a column for each of `parts`, in their order. The part named by
    `share` adds up to 1 within 1e-9.
    """

    def __init__(self, meaning: str, *, share: str, example: list[dict[str, float]], **parts: Parameter) -> None:
        super().__init__(meaning, example=example)
        self.share = share
        self.parts = parts
        for name, part in parts.items():
            part.name = name

    def as_numbers(self, given: Iterable[Mapping[str, float]]) -> Numbers:  # noqa: D102 - as described in Declaration
        return np.array([[row[name] for name in self.parts] for row in given], dtype=np.float64)

    def refusals(self, value: Numbers) -> list[Refusal]:  # noqa: D102 - as described in Declaration
        columns = dict(zip(self.parts, value.T, strict=True))
        for name, part in self.parts.items():
            for found in part.refusals(columns[name]):
                return [Refusal((self.name, *found.path[1:], name), found.code, found.detail, found.params)]
        total = float(columns[self.share].sum())
        if abs(total - 1) <= SHARE_TOLERANCE:
            return []
        detail = f"The {self.share}s of {self.name} must add up to 1; they add up to {total:.15g}."
        return [Refusal((self.name,), "must_add_up_to_one", detail, {"sum": total, "tolerance": SHARE_TOLERANCE})]


class Rule(Protocol):
    """A rule between the parameters of a class."""

    @property
    def words(self) -> str:
        """The rule as it is printed in the reference."""

    def refusals(self, values: Mapping[str, Numbers]) -> Iterator[Refusal]:
        """Give the first entry that breaks the rule. `values`: float64 arrays that broadcast."""


@dataclass(frozen=True, slots=True)
class Order:
    """A rule between two parameters: `lesser < greater`, or `<=` where they may be equal."""

    lesser: str
    greater: str
    or_equal: bool = False

    @property
    def words(self) -> str:
        """The rule as it is printed in the reference."""
        return f"{self.lesser} {'<=' if self.or_equal else '<'} {self.greater}"

    def refusals(self, values: Mapping[str, Numbers]) -> Iterator[Refusal]:
        """Give the first entry that breaks the rule. `values`: float64 arrays that broadcast."""
        lesser, greater = values[self.lesser], values[self.greater]
        holds: Truths = np.asarray(lesser <= greater if self.or_equal else lesser < greater)
        if holds.all():
            return
        at = (int(np.argmin(holds)),) if holds.ndim else ()
        low, high = (float(np.broadcast_to(v, holds.shape)[at]) for v in (lesser, greater))
        place = at if np.ndim(greater) else ()
        yield Refusal(
            (self.greater, *place),
            "out_of_order",
            f"{self.words} is needed; they are {low:.15g} and {high:.15g}.",
            {"rule": self.words, self.lesser: low, self.greater: high},
        )
