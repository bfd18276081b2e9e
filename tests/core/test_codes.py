"""Codes are declared before they are used."""

import pytest

from service.core.codes import CAUTIONS, FAULTS, METHODS, NULL_REASONS
from service.core.errors import DoesNotFit, Refusal


def test_a_code_that_is_not_listed_cannot_be_refused_with() -> None:
    with pytest.raises(LookupError, match="never_heard_of"):
        Refusal(("mean",), "never_heard_of", "words")


def test_an_error_says_all_its_refusals() -> None:
    error = DoesNotFit([Refusal(("mean",), "empty", "One."), Refusal((), "too_many", "Two.")])
    assert str(error) == "One.; Two."
    assert [refusal.code for refusal in error.refusals] == ["empty", "too_many"]


@pytest.mark.parametrize("listed", [FAULTS, CAUTIONS, NULL_REASONS, METHODS])
def test_every_code_has_a_meaning(listed: dict[str, str]) -> None:
    assert all(code.replace("_", "").isalnum() and meaning.endswith(".") for code, meaning in listed.items())
