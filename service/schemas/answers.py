"""Core figures to JSON: numbers, lists, null with its reason."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from service import __version__
from service.schemas.shapes import COUNT, TAIL, Fixed, Shape, constant, object_of


@dataclass(frozen=True, slots=True)
class Caution:
    """A sentence that belongs to an answer; `pointer` leads into the request."""

    code: str
    detail: str
    pointer: str | None = None
    params: Mapping[str, Any] = field(default_factory=dict)

    def as_json(self) -> dict[str, Any]:
        """Give it in the form of the contract."""
        return {"code": self.code, "detail": self.detail, "pointer": self.pointer, "params": dict(self.params)}


@dataclass(frozen=True, slots=True)
class Result:
    """What an endpoint found: figures by name, and what they rest on."""

    figures: Mapping[str, Any]
    method: str
    numerical_error: float | None
    error_kind: str | None = "bound"
    cautions: tuple[Caution, ...] = ()
    reasons: Mapping[str, str] = field(default_factory=dict)
    """Why members that are None are null, by pointer; others are `no_value`."""


MANY_FORMS = frozenset({"list", "columns"})
"""Forms in which every figure is an array."""


@dataclass(frozen=True, slots=True)
class AnswerShape:
    """A kind of answer: the stem of its component names, its members in order, the forms that it comes in."""

    name: str
    members: Mapping[str, Shape]
    forms: tuple[str, ...] = ("number", "list")
    """Values of `form`; "" for an answer that has none."""

    def components(self) -> dict[str, dict[str, Any]]:
        """Print one component for each form."""
        return {f"{self.name}{'List' if form == 'list' else ''}Answer": self._print(form) for form in self.forms}

    def _print(self, form: str) -> dict[str, Any]:
        many = form in MANY_FORMS
        head: dict[str, Shape] = {"form": Fixed(constant(form))} if form else {}
        if many:
            head["length"] = Fixed(COUNT)
        tail = {name: Fixed(schema) for name, schema in TAIL.items()}
        return object_of(head | dict(self.members) | tail, many)


@dataclass(frozen=True, slots=True)
class Plain:
    """A value that is JSON already and is written as it stands."""

    value: Any


@dataclass(frozen=True, slots=True)
class Single:
    """One number, also where other figures are arrays."""

    value: float


@dataclass(frozen=True, slots=True)
class Listed:
    """A list of numbers that belongs to one answer, such as the points of a curve."""

    values: Any


@dataclass(frozen=True, slots=True)
class Ranks:
    """A rank or an array of them, from 1; 0 stands for none and is written null."""

    values: Any


class Writer:
    """Turns figures into JSON values and notes why some of them are null."""

    def __init__(self, length: int | None, reasons: Mapping[str, str]) -> None:
        self.length = length
        self.known = reasons
        self.null_reasons: list[dict[str, str]] = []

    def write(self, value: Any, pointer: str) -> Any:
        """Give the JSON value of a figure, a group, a list of groups, or a plain value."""
        kind = type(value)
        if kind is dict:
            return {name: self.write(inner, f"{pointer}/{name}") for name, inner in value.items()}
        if kind is list:
            return [self.write(inner, f"{pointer}/{index}") for index, inner in enumerate(value)]
        if kind is Plain:
            return value.value
        if kind is Single:
            return self._number(value.value, pointer)
        if kind is Listed:
            return self._array(value.values, pointer, value.values.size)
        if kind is Ranks:
            return self._ranks(value.values, pointer)
        if kind is str or kind is bool or kind is int:
            return value
        if value is None:
            self.null_reasons.append({"pointer": pointer, "reason": self.known.get(pointer, "no_value")})
            return None
        if kind is not np.float64 and kind is not float and value.dtype.kind != "f":
            return value.tolist()  # counts, words, truths
        return self._number(value, pointer) if self.length is None else self._array(value, pointer, self.length)

    def _ranks(self, values: Any, pointer: str) -> Any:
        if type(values) is int:
            if values == 0:
                self.null_reasons.append({"pointer": pointer, "reason": "no_rank"})
            return values or None
        self.null_reasons += [
            {"pointer": f"{pointer}/{at}", "reason": "no_rank"} for at in np.flatnonzero(values == 0).tolist()
        ]
        return [rank or None for rank in values.tolist()]

    def _number(self, value: Any, pointer: str) -> float | None:
        if math.isfinite(value):
            return float(value) + 0.0  # -0 is written 0
        self.null_reasons.append({"pointer": pointer, "reason": self._reason(value, pointer)})
        return None

    def _array(self, value: Any, pointer: str, length: int) -> Any:
        full = np.broadcast_to(value, (length,)) + 0.0  # orjson prints entries that are not finite as null
        with np.errstate(all="ignore"):
            total = full.sum()
        if math.isfinite(total):  # then every entry is; an overflow of the sum is looked at closely
            return full
        finite = np.isfinite(full)
        if finite.all():
            return full
        bad = full[~finite]
        if bad.size == length and np.array_equal(bad, np.full(length, bad[0]), equal_nan=True):
            self.null_reasons.append({"pointer": pointer, "reason": self._reason(bad[0], pointer)})
        else:
            self.null_reasons += [
                {"pointer": f"{pointer}/{at}", "reason": self._reason(full[at], pointer)}
                for at in np.flatnonzero(~finite).tolist()
            ]
        return full

    def _reason(self, value: Any, pointer: str) -> str:
        if np.isnan(value):
            return self.known.get(pointer, "no_value")
        return "positive_infinity" if value > 0 else "negative_infinity"


def write_answer(result: Result, length: int | None, fingerprint: str | None) -> dict[str, Any]:
    """Write one answer in the form that its length asks for."""
    out: dict[str, Any] = {"form": "number"} if length is None else {"form": "list", "length": length}
    return out | write_plain(result, length, fingerprint)


def write_plain(result: Result, length: int | None, fingerprint: str | None) -> dict[str, Any]:
    """Write an answer without naming its form: figures, then reasons, basis, cautions."""
    writer = Writer(length, result.reasons)
    out: dict[str, Any] = {name: writer.write(value, f"/{name}") for name, value in result.figures.items()}
    out["null_reasons"] = writer.null_reasons
    out["basis"] = basis(result.method, result.numerical_error, result.error_kind, fingerprint)
    out["cautions"] = [caution.as_json() for caution in result.cautions]
    return out


def write_batch(answers: list[dict[str, Any]], fingerprint: str) -> dict[str, Any]:
    """Put the answers of a batch into their envelope; its error is the largest among them."""
    errors = [a["basis"]["numerical_error"] for a in answers if a["basis"]["numerical_error"] is not None]
    kinds = {a["basis"]["numerical_error_kind"] for a in answers}
    kind = "estimate" if "estimate" in kinds else "bound"
    return {
        "form": "batch",
        "length": len(answers),
        "answers": answers,
        "basis": basis("batch", max(errors, default=None), kind, fingerprint),
        "cautions": [],
    }


def basis(method: str, error: float | None, kind: str | None, fingerprint: str | None) -> dict[str, Any]:
    """Say what figures rest on."""
    return {
        "service_version": __version__,
        "method": method,
        "numerical_error": error,
        "numerical_error_kind": None if error is None else kind,
        "request_fingerprint": fingerprint,
    }
