"""Parameters are checked when they are given: limits, order, lists, and the rules of single families."""

from typing import Any

import numpy as np
import pytest

from service.core.arrays import number
from service.core.distributions import FAMILIES, Family
from service.core.errors import DoesNotFit
from service.core.parameters import Components, Parameter, Sample, anywhere, positive
from tests.core.distributions.laws import law


def limited() -> list[Any]:
    """Every limit of every parameter of every family, with a value just beyond it."""
    cases = []
    for kind in FAMILIES.values():
        for way, declared in enumerate(kind.parameterisations):
            for name, parameter in declared.parameters.items():
                for limit in parameter.limits if isinstance(parameter, Parameter) else ():
                    beyond = {
                        "above": limit.bound,
                        "below": limit.bound,
                        "at_least": np.nextafter(limit.bound, -np.inf),
                        "at_most": np.nextafter(limit.bound, np.inf),
                    }[limit.relation]
                    cases.append(
                        pytest.param(kind, way, name, limit, beyond, id=f"{kind.name}-{way}-{name}-{limit.relation}")
                    )
    return cases


@pytest.mark.parametrize(("kind", "way", "name", "limit", "beyond"), limited())
def test_parameters_beyond_their_limits_are_refused(
    kind: type[Family], way: int, name: str, limit: Any, beyond: float
) -> None:
    declared = kind.parameterisations[way].parameters
    given = {n: p.example for n, p in declared.items()} | {name: beyond}
    with pytest.raises(DoesNotFit) as refused:
        law(kind.name, way, **given)
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == ((name,), limit.code)
    assert refusal.params[limit.relation] == limit.bound


def test_a_refusal_names_the_entry_of_an_array() -> None:
    with pytest.raises(DoesNotFit) as refused:
        law("normal", mean=0, standard_deviation=[1, 2, -3])
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (("standard_deviation", 2), "must_be_positive")
    assert refusal.detail == "standard_deviation must be above 0; it is -3."


def test_a_limit_says_itself_in_words() -> None:
    cases: list[tuple[dict[str, Any], str, str]] = [
        ({"above": 0.0}, "above 0", "must_be_positive"),
        ({"at_least": 0.0}, "0 or more", "must_not_be_negative"),
        ({"below": 0.0}, "below 0", "must_be_below"),
        ({"at_most": 12.5}, "at most 12.5", "must_be_at_most"),
    ]
    for limits, words, code in cases:
        (limit,) = Parameter("a number", example=1, **limits).limits
        assert (limit.words, limit.code) == (words, code)


@pytest.mark.parametrize(
    ("given", "path"),
    [
        ({"lower": 2, "upper": 1}, ("upper",)),
        ({"lower": 1, "upper": 1}, ("upper",)),
        ({"lower": [0, 5], "upper": 1}, ("upper",)),
        ({"lower": [0, 5], "upper": [1, 4]}, ("upper", 1)),
    ],
)
def test_ends_in_the_wrong_order_are_refused(given: dict[str, Any], path: tuple[Any, ...]) -> None:
    with pytest.raises(DoesNotFit) as refused:
        law("uniform", **given)
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (path, "out_of_order")
    assert refusal.params["rule"] == "lower < upper"


def test_ends_may_be_equal_where_the_rule_says_so() -> None:
    assert law("discrete_uniform", lowest=2, highest=2).entropy() == 0
    with pytest.raises(DoesNotFit, match="lowest <= highest"):
        law("discrete_uniform", lowest=2, highest=1)


def test_a_sample_needs_an_entry() -> None:
    with pytest.raises(DoesNotFit) as refused:
        law("empirical", observations=[])
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (("observations",), "too_few")


def test_another_way_to_give_the_parameters() -> None:
    growth = law("lognormal", 1, mean=1.07, standard_deviation=0.2)
    assert growth.moments().mean == pytest.approx(1.07, rel=1e-15, abs=0)
    assert growth.moments().standard_deviation == pytest.approx(0.2, rel=1e-15, abs=0)
    heavy = law("student_t", 1, degrees_of_freedom=3, mean=0.05, standard_deviation=0.2)
    assert heavy.moments().standard_deviation == pytest.approx(0.2, rel=1e-15, abs=0)


def test_a_spread_that_a_double_cannot_hold_is_refused() -> None:
    for given in ({"mean": 1e100, "standard_deviation": 1e-100}, {"mean": [1, 1e-100], "standard_deviation": 1e100}):
        with pytest.raises(DoesNotFit) as refused:
            law("lognormal", 1, **given)
        assert {refusal.code for refusal in refused.value.refusals} == {"not_representable"}


def test_kinds_of_parameters() -> None:
    assert [limit.bound for limit in anywhere("a place", example=0).limits] == [-1e150, 1e150]
    assert [limit.bound for limit in positive("a width", example=1).limits] == [0, 1e-150, 1e150]
    assert Sample("some numbers", example=[1, 2]).refusals(np.array([1.0])) == []


PARTS = Components(
    "the parts",
    share="weight",
    example=[{"weight": 1, "size": 2}],
    weight=Parameter("its share", above=0, at_most=1, example=0.5),
    size=positive("its size", example=2),
)
PARTS.name = "parts"


@pytest.mark.parametrize(
    ("rows", "path", "code"),
    [
        ([{"weight": 0.5, "size": 1}, {"weight": 0.5, "size": -1}], ("parts", 1, "size"), "must_be_positive"),
        ([{"weight": 0, "size": 1}, {"weight": 1, "size": 1}], ("parts", 0, "weight"), "must_be_positive"),
        ([{"weight": 0.5, "size": 1}, {"weight": 0.4, "size": 1}], ("parts",), "must_add_up_to_one"),
    ],
)
def test_components_are_checked_part_by_part(rows: list[dict[str, float]], path: tuple[Any, ...], code: str) -> None:
    (refusal,) = PARTS.refusals(PARTS.as_numbers(rows))
    assert (refusal.path, refusal.code) == (path, code)


def test_components_add_up_within_a_billionth() -> None:
    rows = [{"weight": 0.5, "size": 1.0}, {"weight": 0.5 + 5e-10, "size": 2.0}]
    assert PARTS.refusals(PARTS.as_numbers(rows)) == []


@pytest.mark.parametrize(
    ("skewness", "excess", "path", "least", "most"),
    [
        (2.6, 10, ("skewness",), -2.48528, 2.48528),
        (0, -0.1, ("excess_kurtosis",), 0, 8),
        (0, 8.1, ("excess_kurtosis",), 0, 8),
        (1, 1, ("excess_kurtosis",), 1.56905, 8.8754),
        ([0, 1], [1, 0], ("excess_kurtosis", 1), 1.56905, 8.8754),
        ([0, -2.7], 2, ("skewness", 1), -2.48528, 2.48528),
        ([0, 2], 1, ("excess_kurtosis",), 6.53711, 11.24067),
    ],
)
def test_an_expansion_that_falls_somewhere_is_refused(
    skewness: Any, excess: Any, path: tuple[Any, ...], least: float, most: float
) -> None:
    """The region of Maillard (2012): 4 (1 + 11 s/36 -+ sqrt(1 - s/6 + s^2/1296)), s the square of the skewness."""
    with pytest.raises(DoesNotFit) as refused:
        law("cornish_fisher", mean=0, standard_deviation=1, skewness=skewness, excess_kurtosis=excess)
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (path, "expansion_not_monotone")
    assert (refusal.params["at_least"], refusal.params["at_most"]) == pytest.approx((least, most), rel=1e-5, abs=1e-12)


def test_the_edge_of_the_monotone_region_is_allowed() -> None:
    plain = law("cornish_fisher", mean=0, standard_deviation=1, skewness=0, excess_kurtosis=0)
    steep = law("cornish_fisher", mean=1, standard_deviation=1, skewness=0, excess_kurtosis=8)
    with np.errstate(all="ignore"):
        assert plain.entropy() == pytest.approx(0.5 * np.log(2 * np.pi * np.e), rel=1e-14, abs=0)
        assert steep.most_likely() == 1
        assert steep.density(number(1.0)) == np.inf
        assert steep.tails(number(1.0)).at_most == 0.5
        # w(z) = z^3/3: E log w'(Z) = E log Z^2 = -log 2 - Euler's constant
        exact = 0.5 * np.log(2 * np.pi * np.e) - np.log(2) - np.euler_gamma
        assert steep.entropy() == pytest.approx(exact, rel=1e-12, abs=0)


@pytest.mark.parametrize(
    ("ends", "path"),
    [
        ({"lower": 2e6, "upper": 3e6}, ("lower",)),
        ({"lower": -3e6, "upper": -2e6}, ("upper",)),
        ({"lower": -3e6, "upper": [2e6, -2e6]}, ("upper", 1)),
    ],
)
def test_a_truncation_out_of_reach_is_refused(ends: dict[str, Any], path: tuple[Any, ...]) -> None:
    with pytest.raises(DoesNotFit) as refused:
        law("truncated_normal", mean=0, standard_deviation=1, **ends)
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (path, "not_representable")
    assert law("truncated_normal", mean=0, standard_deviation=1, lower=1e6, upper=2e6).moments().mean >= 1e6


@pytest.mark.parametrize(
    ("successes", "probability", "path"),
    [(1e10, 1e-6, ("success_probability",)), (1e10, [0.5, 1e-6], ("success_probability", 1))],
)
def test_more_failures_than_a_double_counts_are_refused(
    successes: float, probability: Any, path: tuple[Any, ...]
) -> None:
    with pytest.raises(DoesNotFit) as refused:
        law("negative_binomial", successes=successes, success_probability=probability)
    (refusal,) = refused.value.refusals
    assert (refusal.path, refusal.code) == (path, "not_representable")
