"""POST and GET /v1/curves. Where the points lie is tested in tests/core/distributions/test_curves.py."""

import pytest

from tests.conftest import Asker

PATH = "/v1/curves"
NORMAL = {"family": "normal", "mean": 0.06, "standard_deviation": 0.1}


def test_a_curve_has_points_and_the_shaded_chance(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "curve": "density", "shade": {"below": 0}})
    assert "form" not in answer
    assert len(answer["x"]) == len(answer["y"]) <= 200
    assert answer["x"] == sorted(answer["x"])
    assert 0 in answer["x"]
    assert answer["discrete"] is False
    assert answer["shaded"]["probability"] == pytest.approx(0.2742531177500736, rel=1e-14)
    assert (answer["shaded"]["lower"], answer["shaded"]["upper"]) == (None, 0)
    assert answer["null_reasons"] == [{"pointer": "/shaded/lower", "reason": "negative_infinity"}]


def test_without_shade_nothing_is_shaded(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "curve": "cumulative"})
    assert answer["shaded"] is None
    assert answer["null_reasons"] == [{"pointer": "/shaded", "reason": "needs_shade"}]


def test_discrete_families_are_masses(ask: Asker) -> None:
    die = {"family": "discrete_uniform", "lowest": 1, "highest": 6}
    answer = ask.answer(PATH, {"distribution": die, "curve": "density", "shade": {"at_least": 5}})
    assert answer["discrete"] is True
    assert answer["x"] == [1, 2, 3, 4, 5, 6]
    assert answer["y"] == pytest.approx([1 / 6] * 6)
    assert answer["shaded"]["probability"] == pytest.approx(1 / 3)


def test_a_pole_is_null_with_its_reason(ask: Asker) -> None:
    law = {"family": "gamma", "shape": 0.5, "scale": 1}
    answer = ask.answer(PATH, {"distribution": law, "curve": "density"})
    assert (answer["x"][0], answer["y"][0]) == (0, None)
    assert {"pointer": "/y/0", "reason": "positive_infinity"} in answer["null_reasons"]


def test_get_takes_the_bounds_of_the_shade_flat(ask: Asker) -> None:
    got = ask.get(f"{PATH}?family=normal&mean=0.06&standard_deviation=0.1&curve=density&points=20&below=0").get_json()
    posted = ask.answer(PATH, {"distribution": NORMAL, "curve": "density", "points": 20, "shade": {"below": 0}})
    assert got | {"basis": 0} == posted | {"basis": 0}
    plain = ask.get(f"{PATH}?family=normal&mean=0.06&standard_deviation=0.1&curve=density").get_json()
    assert plain["shaded"] is None


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({"distribution": NORMAL}, {"/curve": "required"}),
        ({"distribution": NORMAL, "curve": "hazard"}, {"/curve": "unknown_choice"}),
        ({"distribution": NORMAL, "curve": "density", "points": 9}, {"/points": "must_be_at_least"}),
        ({"distribution": NORMAL, "curve": "density", "points": 2001}, {"/points": "must_be_at_most"}),
        ({"distribution": NORMAL, "curve": "density", "points": [20]}, {"/points": "no_arrays"}),
        ({"distribution": NORMAL | {"mean": [1, 2]}, "curve": "density"}, {"/distribution/mean": "no_arrays"}),
        ({"distribution": NORMAL, "curve": "density", "shade": {"below": [1]}}, {"/shade/below": "no_arrays"}),
        ({"distribution": NORMAL, "curve": "density", "shade": {}}, {"/shade": "no_event"}),
        ({"distribution": NORMAL, "curve": "density", "questions": []}, {"/questions": "unknown_field"}),
    ],
)
def test_what_does_not_fit(ask: Asker, question: object, expected: dict[str, str]) -> None:
    assert ask.faults(PATH, question) == expected
