"""A probability in so many of so many: the rule, and every way to break it."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.core.portfolio.frequencies import frequencies

ERROR = 1e-15


def of(probability: float, certain: bool = False, error: float = ERROR) -> tuple[int, int, str]:
    found = frequencies(np.array([probability]), np.array([certain]), error)
    return int(found.count[0]), int(found.out_of[0]), str(found.bound[0])


@pytest.mark.parametrize(
    ("probability", "certain", "expected"),
    [
        (0.3446, False, (34, 100, "about")),
        (0.05, False, (5, 100, "about")),
        (0.95, False, (95, 100, "about")),
        (0.0426, False, (4, 100, "about")),
        (0.0149, False, (15, 1000, "about")),
        (0.004, False, (4, 1000, "about")),
        (0.996, False, (996, 1000, "about")),
        (0.000123, False, (12, 100_000, "about")),
        (2e-6, False, (2, 1_000_000, "about")),
        (3e-7, False, (1, 1_000_000, "at_most")),
        (1.5e-6, False, (2, 1_000_000, "at_most")),
        (1 - 3e-7, False, (999_999, 1_000_000, "at_least")),
        (1 - 1.5e-6, False, (999_998, 1_000_000, "at_least")),
        (0.0, False, (1, 1_000_000, "at_most")),
        (1.0, False, (999_999, 1_000_000, "at_least")),
        (0.0, True, (0, 100, "exactly")),
        (1.0, True, (100, 100, "exactly")),
        (0.5, True, (50, 100, "about")),
    ],
)
def test_examples(probability: float, certain: bool, expected: tuple[int, int, str]) -> None:
    assert of(probability, certain) == expected


def test_a_figure_lost_in_the_numerical_error_is_a_bound_that_counts_the_error() -> None:
    assert of(0.00390625, error=2**-10) == (4883, 1_000_000, "at_most")
    assert of(1 - 0.00390625, error=2**-10) == (995_117, 1_000_000, "at_least")
    assert of(0.25, error=2.0) == (1_000_000, 1_000_000, "at_most")
    assert of(0.75, error=2.0) == (0, 1_000_000, "at_least")


@given(st.floats(0, 1), st.booleans())
def test_every_count_is_within_a_tenth_or_a_bound(probability: float, certain: bool) -> None:
    count, out_of, bound = of(probability, certain)
    share, smaller = count / out_of, min(probability, 1 - probability)
    match bound:
        case "about":
            assert abs(share - probability) <= smaller / 10
            assert out_of == 100 or abs(round(probability * out_of / 10) / (out_of / 10) - probability) > smaller / 10
        case "at_most":
            assert probability <= share + 1e-12
            assert count >= 1
        case "at_least":
            assert probability >= share - 1e-12
            assert count <= 999_999
        case _:
            assert bound == "exactly"
            assert certain
            assert share == probability


@given(st.floats(0.05, 0.95))
def test_an_ordinary_chance_is_told_in_a_hundred(probability: float) -> None:
    assert of(probability)[1:] == (100, "about")
