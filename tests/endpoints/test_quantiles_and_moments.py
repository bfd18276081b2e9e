"""POST /v1/quantiles and /v1/moments."""

import math

import pytest

from tests.conftest import Asker

PATH = "/v1/quantiles"
NORMAL = {"family": "normal", "mean": 0.06, "standard_deviation": 0.1}


def test_a_discrete_quantile_is_the_smallest_value_that_reaches_the_probability(ask: Asker) -> None:
    law = {"family": "binomial", "trials": 20, "success_probability": 0.5}
    answer = ask.answer(PATH, {"distribution": law, "probability": 0.95})
    assert (answer["form"], answer["kind"], answer["value"]) == ("number", "quantile", 14)
    # the 14 successes of twenty fair throws, counted
    assert answer["probability_at_value"] == pytest.approx(sum(math.comb(20, k) for k in range(15)) / 2**20, rel=1e-13)


def test_the_upper_tail_is_asked_by_its_own_probability(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "probability": 1e-300, "tail": "upper"})
    lower = ask.answer(PATH, {"distribution": NORMAL | {"mean": -0.06}, "probability": 1e-300})
    assert answer["value"] == pytest.approx(-lower["value"], rel=1e-15)
    assert answer["probability_at_value"] == pytest.approx(1e-300, rel=1e-11)


def test_coverage_gives_an_interval_with_equal_tails(ask: Asker) -> None:
    answer = ask.answer(PATH, {"distribution": NORMAL, "coverage": 0.95})
    assert answer["kind"] == "interval"
    assert answer["coverage"] == 0.95
    assert answer["lower"] == pytest.approx(-0.1359963984540054, rel=1e-14)
    assert answer["upper"] == pytest.approx(0.2559963984540054, rel=1e-14)


def test_infinite_ends_are_null_with_their_reason(ask: Asker) -> None:
    law = {"family": "exponential", "rate": 2}
    answer = ask.answer(PATH, {"distribution": law, "probability": [0.5, 0, 1]})
    assert answer["value"] == [pytest.approx(math.log(2) / 2), 0, None]
    assert answer["probability_at_value"] == [pytest.approx(0.5), 0, 1]
    assert answer["null_reasons"] == [{"pointer": "/value/2", "reason": "positive_infinity"}]


@pytest.mark.parametrize(
    ("question", "expected"),
    [
        ({"distribution": NORMAL}, {"": "required"}),
        ({"distribution": NORMAL, "probability": 0.1, "coverage": 0.9}, {"/coverage": "does_not_go_together"}),
        ({"distribution": NORMAL, "coverage": 0.9, "tail": "upper"}, {"/tail": "does_not_go_together"}),
        ({"distribution": NORMAL, "probability": 0.1, "tail": "uper"}, {"/tail": "unknown_choice"}),
        ({"distribution": NORMAL, "probability": 0.1, "tail": 1}, {"/tail": "not_text"}),
        ({"distribution": NORMAL, "probability": [0.5, 1.5]}, {"/probability/1": "must_be_at_most"}),
        ({"distribution": NORMAL, "probability": -0.5}, {"/probability": "must_not_be_negative"}),
        (
            {"distribution": NORMAL | {"mean": [1, 2]}, "probability": [0.1, 0.2, 0.3]},
            {"/distribution/mean": "lengths_differ", "/probability": "lengths_differ"},
        ),
    ],
)
def test_what_does_not_fit(ask: Asker, question: object, expected: dict[str, str]) -> None:
    found = ask.faults(PATH, question)
    assert found.items() <= expected.items()
    assert found


def test_get_takes_the_same_questions(ask: Asker) -> None:
    got = ask.get(f"{PATH}?family=normal&mean=0.06&standard_deviation=0.1&probability=0.05&tail=upper").get_json()
    posted = ask.answer(PATH, {"distribution": NORMAL, "probability": 0.05, "tail": "upper"})
    assert got | {"basis": 0} == posted | {"basis": 0}


def test_moments_of_a_fair_die(ask: Asker) -> None:
    # common practice, no source: mean 7/2, variance 35/12; no face stands out
    answer = ask.answer("/v1/moments", {"distribution": {"family": "discrete_uniform", "lowest": 1, "highest": 6}})
    assert answer["mean"] == pytest.approx(3.5)
    assert answer["variance"] == pytest.approx(35 / 12)
    assert answer["mode"] is None
    assert answer["entropy"] == pytest.approx(math.log(6))
    assert answer["support"] == {"lower": 1, "upper": 6}
    assert {"pointer": "/mode", "reason": "no_value"} in answer["null_reasons"]


def test_moments_that_do_not_exist_say_so(ask: Asker) -> None:
    law = {"family": "student_t", "degrees_of_freedom": [1, 2, 3.5]}
    answer = ask.answer("/v1/moments", {"distribution": law})
    assert answer["mean"] == [None, 0, 0]
    assert answer["standard_deviation"][1] is None
    reasons = {each["pointer"]: each["reason"] for each in answer["null_reasons"]}
    assert reasons["/mean/0"] == "no_value"
    assert reasons["/standard_deviation/1"] == "positive_infinity"
    assert reasons["/kurtosis/2"] == "positive_infinity"


def test_moments_of_a_normal_law(ask: Asker) -> None:
    answer = ask.answer("/v1/moments", {"distribution": NORMAL})
    # common practice, no source: skewness 0, kurtosis 3, about 68, 95 and 99.7 % within 1, 2, 3 standard deviations
    assert (answer["skewness"], answer["kurtosis"]) == (0, 3)
    near = answer["within_standard_deviations"]
    assert [round(near[count], 3) for count in ("one", "two", "three")] == [0.683, 0.954, 0.997]
