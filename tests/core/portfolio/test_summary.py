"""The summary says in plain words what the figures say, and no more."""

from typing import Any

import pytest

from tests.core.portfolio.build import floor, normal, ranking
from tests.core.returns.build import returns

THREE = [normal(0.04, 0.06), normal(0.06, 0.1), normal(0.08, 0.16)]
NAMES = ["Cautious", "Balanced", "Growth"]
LOGNORMAL: dict[str, Any] = {"model": "lognormal", "expected_return": 0.06, "volatility": 0.12}
BOLD: dict[str, Any] = {"model": "lognormal", "expected_return": 0.08, "volatility": 0.16}


def said(portfolios: Any = THREE, names: Any = NAMES, **question: Any) -> str:
    return ranking(portfolios, names, **question).summary


def test_who_misses_the_floor_least_often() -> None:
    assert said() == "Of these 3, Balanced misses a floor of 2 % least often: in about 34 of 100 such years."


def test_portfolios_without_a_name_are_called_by_their_place() -> None:
    assert said(names=["Cautious", None]) == (
        "Of these 3, portfolio 2 misses a floor of 2 % least often: in about 34 of 100 such years."
    )
    assert said(THREE[:1], ()) == "Portfolio 1 misses a floor of 2 % in about 37 of 100 such years."


def test_ties() -> None:
    assert said([*THREE, THREE[1]]) == (
        "Of these 4, Balanced and portfolio 4 miss a floor of 2 % least often: each in about 34 of 100 such years."
    )
    assert said([*THREE, THREE[1], THREE[1]]) == (
        "Of these 5, Balanced and 2 others miss a floor of 2 % least often: each in about 34 of 100 such years."
    )
    assert said([THREE[1]] * 3) == "All of these 3 miss a floor of 2 % equally often: in about 34 of 100 such years."


def test_other_criteria_name_what_leads_and_who_misses_the_floor_least_often() -> None:
    assert said(criterion="expected_gap") == (
        "Of these 3, Cautious has the smallest average gap below a floor of 2 %; it misses that floor in about 37 of "
        "100 such years. Balanced misses it least often: in about 34 of 100 such years."
    )
    assert said(criterion="quantile_return", quantile_probability=0.01) == (
        "Of these 3, Cautious has the highest return that is missed in 1 % of such years; it misses a floor of 2 % in "
        "about 37 of 100 such years. Balanced misses it least often: in about 34 of 100 such years."
    )
    assert said([THREE[1], THREE[1], THREE[0]], criterion="expected_return") == (
        "Of these 3, Cautious and Balanced have the highest expected return; Cautious misses a floor of 2 % in about "
        "34 of 100 such years."
    )


def test_a_limit() -> None:
    assert said(criterion="expected_return", limit=0.36) == (
        "Of the 2 of these 3 within the limit, Growth has the highest expected return; it misses a floor of 2 % in "
        "about 35 of 100 such years. Balanced misses it least often: in about 34 of 100 such years."
    )
    assert said(limit=0.346) == (
        "Of these 3, only Balanced keeps within the limit: it misses a floor of 2 % in about 34 of 100 such years."
    )
    assert said(limit=0.1) == (
        "None of these 3 keeps within the limit. Balanced misses a floor of 2 % least often: in about 34 of 100 such "
        "years."
    )
    assert said(THREE[:1], limit=0.1) == (
        "Cautious misses a floor of 2 % in about 37 of 100 such years, more often than the limit allows."
    )


def test_the_ratio_and_the_chance_may_name_different_leaders() -> None:
    assert said([returns(**LOGNORMAL), returns(**BOLD)], ["Calm", "Bold"], floor=floor(0.02, 30)) == (
        "Of these 2, Calm has the highest safety-first ratio for a floor of 2 % a year; it misses that floor in about "
        "6 of 100 such 30-year periods. Bold misses it least often: in about 4 of 100 such 30-year periods."
    )


def test_no_value_of_the_criterion() -> None:
    heavy: dict[str, Any] = {"model": "student_t", "compounding": "continuous", "volatility": 0.1}
    two = [returns(**heavy, expected_return=m, degrees_of_freedom=4) for m in (0.05, 0.07)]
    assert said(two, ()) == (
        "None of these 2 has a safety-first ratio. Portfolio 2 misses a floor of 2 % least often: in about 26 of 100 "
        "such years."
    )


@pytest.mark.parametrize(
    ("years", "words"),
    [
        (1, "years"),
        (0.25, "quarters"),
        (1 / 12, "months"),
        (1 / 52, "weeks"),
        (1 / 252, "days"),
        (0.5, "6-month periods"),
        (1.5, "18-month periods"),
        (10, "10-year periods"),
        (2.3, "2.3-year periods"),
        (0.07, "0.07-year periods"),
    ],
)
def test_the_horizon_is_the_unit(years: float, words: str) -> None:
    assert said([returns(**LOGNORMAL)], ["Calm"], floor=floor(0.02, years)).endswith(f" of 100 such {words}.")


@pytest.mark.parametrize(
    ("asked", "words"),
    [
        (floor(0.02, 10), "a floor of 2 % a year in"),
        (floor(0.2, 10, "over_horizon"), "a floor of 20 % over the whole period in"),
        (floor(0.07), "a floor of 7 % in"),
        (floor(-0.0125), "a floor of -1.25 % in"),
        (floor(0), "a floor of 0 % in"),
    ],
)
def test_the_floor_in_words(asked: Any, words: str) -> None:
    assert f"Calm misses {words} about" in said([returns(**LOGNORMAL)], ["Calm"], floor=asked)


@pytest.mark.parametrize(
    ("portfolio", "words"),
    [
        (normal(0.5, 0.05), "in at most 1 of 1,000,000 such years"),
        (normal(-0.5, 0.05), "in at least 999,999 of 1,000,000 such years"),
        (normal(0.03, 0), "in exactly 0 of 100 such years"),
        (normal(0.01, 0), "in exactly 100 of 100 such years"),
        (normal(0.15, 0.05), "in about 5 of 1,000 such years"),
    ],
)
def test_how_often_in_words(portfolio: Any, words: str) -> None:
    assert said([portfolio], ["One"]) == f"One misses a floor of 2 % {words}."
