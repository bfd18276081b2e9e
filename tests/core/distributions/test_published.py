"""Printed tables: each row of tests/data/tables.json names its source and how it is known."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import quantile
from tests.core.distributions.laws import law

ROWS: list[dict[str, Any]] = json.loads((Path(__file__).parents[2] / "data" / "tables.json").read_text())["rows"]


def figure(row: dict[str, Any]) -> float:
    """The figure as the table prints it."""
    asked, at = law(row["family"], **row["parameters"]), number(row["at"])
    with np.errstate(all="ignore"):
        if row.get("transform") == "minus log10 of the probability":
            return float(-asked.log_tails(at).above / np.log(10))
        match row["question"]:
            case "at_most" | "above" as tail:
                value = getattr(asked.tails(at), tail)
            case "density":
                value = asked.density(at)
            case question:
                value = quantile(asked, at, upper=question == "quantile_upper").value
    return float(value) - (0.5 if row.get("transform") == "probability minus 0.5" else 0)


@pytest.mark.parametrize("row", ROWS, ids=[row["id"] for row in ROWS])
def test_agrees_with_the_printed_value(row: dict[str, Any]) -> None:
    expected = float(row["expected"])
    (kind, size), *_ = row["tolerance"].items()
    # half a unit of the last digit, and the rounding of that half itself
    allowed = size * (1 + 1e-9) if kind == "absolute" else size * abs(expected)
    assert abs(figure(row) - expected) <= allowed
