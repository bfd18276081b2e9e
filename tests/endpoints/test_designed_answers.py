"""Whole answers against those of the design, whose figures are printed to nine or ten digits."""

import json
from pathlib import Path
from typing import Any

import pytest

from tests.conftest import Asker

DESIGNED = json.loads((Path(__file__).parent.parent / "data" / "designed_answers.json").read_text())


def assert_agrees(found: Any, designed: Any, pointer: str = "") -> None:
    """Compare every member that the design shows."""
    if isinstance(designed, dict):
        assert designed.keys() <= found.keys(), pointer
        for name, inner in designed.items():
            assert_agrees(found[name], inner, f"{pointer}/{name}")
    elif isinstance(designed, list):
        assert len(found) == len(designed), pointer
        for index, inner in enumerate(designed):
            assert_agrees(found[index], inner, f"{pointer}/{index}")
    elif isinstance(designed, float):
        assert found == pytest.approx(designed, rel=5e-9, abs=1e-12), pointer
    else:
        assert found == designed, pointer


@pytest.mark.parametrize("designed", DESIGNED, ids=lambda each: each["name"])
def test_answers_are_those_of_the_design(ask: Asker, designed: dict[str, Any]) -> None:
    assert_agrees(ask.answer(designed["path"], designed["request"]), designed["answer"])
