"""Every family against its reference values, computed with many digits (tests/data/distributions)."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import FAMILIES, Family, quantile
from tests.core.distributions.laws import law

DATA = Path(__file__).parents[2] / "data" / "distributions"
QUESTIONS = ("at_most", "above", "density", "quantile", "quantile_upper", "moments")
ENDLESS = {"infinite": np.inf, "undefined": np.nan}


def rows_of(family: str) -> list[dict[str, Any]]:
    rows: list[dict[str, Any]] = json.loads((DATA / f"{family}.json").read_text())["rows"]
    return rows


def ask(asked: Family, question: str, at: float) -> float:
    x = number(at)
    with np.errstate(all="ignore"):
        match question:
            case "at_most" | "above":
                return float(getattr(asked.tails(x), question))
            case "density":
                return float(asked.density(x))
            case _:
                return float(quantile(asked, x, upper=question == "quantile_upper").value)


def answers(row: dict[str, Any], family: str) -> list[tuple[float, float]]:
    """Pairs of the figure given and the figure expected."""
    asked = law(family, **row["parameters"])
    if row["question"] != "moments":
        return [(ask(asked, row["question"], row["at"]), float(row["expected"]))]
    with np.errstate(all="ignore"):
        mean, spread, skewness, excess = asked.moments()
    given = {"mean": mean, "variance": spread**2, "skewness": skewness, "excess_kurtosis": excess}
    return [(float(given[name]), as_number(text)) for name, text in row["expected"].items()]


def as_number(text: str) -> float:
    return ENDLESS[text] if text in ENDLESS else float(text)


def relative_error(given: float, expected: float) -> float:
    if given == expected or (np.isnan(given) and np.isnan(expected)):
        return 0.0
    if not np.isfinite(given) or not np.isfinite(expected):
        return np.inf
    return abs(given - expected) / (abs(expected) or 1.0)


@pytest.mark.parametrize("family", FAMILIES)
def test_every_family_has_reference_values_for_every_question(family: str) -> None:
    assert {row["question"] for row in rows_of(family)} == set(QUESTIONS)


@pytest.mark.parametrize("question", QUESTIONS)
@pytest.mark.parametrize("family", FAMILIES)
def test_agrees_with_the_reference_values(family: str, question: str) -> None:
    wrong = [
        (row["id"], given, expected)
        for row in rows_of(family)
        if row["question"] == question
        for given, expected in answers(row, family)
        if not relative_error(given, expected) <= 1e-12 + 4e-16 * row.get("condition", 0)
    ]
    assert not wrong


@pytest.mark.parametrize("family", FAMILIES)
def test_stays_within_the_declared_numerical_error(family: str) -> None:
    bound = FAMILIES[family].numerical_error
    wrong = [
        (row["id"], given, expected, abs(given - expected) / max(1, abs(expected)))
        for row in rows_of(family)
        for given, expected in answers(row, family)
        if np.isfinite(expected) and not abs(given - expected) <= bound * max(1, abs(expected))
    ]
    assert not wrong
