"""Probabilities of events: bounds and their strictness, both sides, intervals, and what is refused."""

from collections.abc import Mapping
from typing import Any

import numpy as np
import pytest
from mpmath import erfc, log, mp, mpf, sqrt

from service.core.arrays import number
from service.core.distributions import Chances, Event, chances
from service.core.errors import DoesNotFit
from tests.core.distributions.laws import law, plain

NORMAL = law("normal", mean=0, standard_deviation=1)
DIE = law("discrete_uniform", lowest=1, highest=6)


def ask(asked: Any, **bounds: Any) -> Chances:
    return chances(
        asked, Event.of({n: np.array(v, np.float64) if isinstance(v, list) else v for n, v in bounds.items()})
    )


def between_exactly(low: float, high: float) -> Any:
    """Phi(high) - Phi(low) with 420 digits."""
    with mp.workdps(420):
        return (erfc(mpf(low) / sqrt(2)) - erfc(mpf(high) / sqrt(2))) / 2


@pytest.mark.parametrize(
    ("bounds", "sixths"),
    [
        ({"at_most": 4.0}, 4),
        ({"below": 4.0}, 3),
        ({"at_least": 4.0}, 3),
        ({"above": 4.0}, 2),
        ({"at_most": 4.5}, 4),
        ({"below": 4.5}, 4),
        ({"at_most": 0.5}, 0),
        ({"at_most": 100.0}, 6),
        ({"exactly": 3.0}, 1),
        ({"exactly": 3.5}, 0),
        ({"exactly": 7.0}, 0),
        ({"at_least": 2.0, "at_most": 5.0}, 4),
        ({"above": 2.0, "at_most": 5.0}, 3),
        ({"at_least": 2.0, "below": 5.0}, 3),
        ({"above": 2.0, "below": 5.0}, 2),
        ({"above": 3.0, "below": 3.0}, 0),
        ({"above": 3.0, "at_most": 3.0}, 0),
        ({"at_least": 3.0, "at_most": 3.0}, 1),
        ({"above": 3.0, "below": 4.0}, 0),
        ({"within_standard_deviations": 1.0}, 4),
        ({"within_standard_deviations": 0.0}, 0),
        ({"within_standard_deviations": 2.0}, 6),
    ],
)
def test_strictness_of_bounds_on_a_die(bounds: Mapping[str, float], sixths: int) -> None:
    answer = chances(DIE, Event.of(bounds))
    assert answer.probability == pytest.approx(sixths / 6, abs=2e-16)
    assert answer.complement == pytest.approx(1 - sixths / 6, abs=2e-16)
    assert np.exp(answer.log_probability) == pytest.approx(sixths / 6, abs=4e-16)
    assert np.exp(answer.log_complement) == pytest.approx(1 - sixths / 6, abs=4e-16)


def test_one_sided_events_are_the_tails() -> None:
    for bounds in ({"above": 37.0}, {"at_least": 37.0}):
        answer = chances(NORMAL, Event.of(bounds))
        assert answer.probability == pytest.approx(float(erfc(37 / sqrt(mpf(2))) / 2), rel=1e-12, abs=0)
        assert answer.complement == 1
        assert answer.lower_score == 37
        assert answer.upper_score is None
    far = chances(NORMAL, Event.of({"at_most": -100.0}))
    with mp.workdps(50):
        assert far.log_probability == pytest.approx(float(log(erfc(100 / sqrt(mpf(2))) / 2)), rel=1e-14, abs=0)
    assert far.upper_score == -100
    assert far.lower_score is None


@pytest.mark.parametrize(
    ("low", "high"),
    [
        (0.5, 0.5 + 2**-30),
        (-1e-9, 1e-9),
        (5, 5 + 2**-20),
        (20, 20 + 2**-30),
        (-37, -37 + 2**-12),
        (-8, 2),
        (-1, 1),
        (36, 37),
        (-40, 40),
        (0.3, 0.9),
        (-1e-300, 1e-300),
    ],
)
def test_intervals_keep_their_digits(low: float, high: float) -> None:
    answer = ask(NORMAL, above=float(low), at_most=float(high))
    exact = between_exactly(low, high)
    assert answer.probability == pytest.approx(float(exact), rel=1e-12, abs=0)
    assert answer.log_probability == pytest.approx(float(log(exact)), rel=1e-14, abs=1e-14)
    assert answer.complement == pytest.approx(float(1 - exact), rel=1e-12, abs=0)
    with mp.workdps(420):
        rest = erfc(mpf(high) / sqrt(2)) / 2 + erfc(-mpf(low) / sqrt(2)) / 2
    assert answer.log_complement == pytest.approx(float(log(rest)), rel=1e-12, abs=0)


def test_an_interval_far_in_a_tail_has_a_logarithm() -> None:
    for near, far in ((200, 201), (200, 200.0001)):
        with mp.workdps(50):
            exact = log((erfc(near / sqrt(mpf(2))) - erfc(mpf(far) / sqrt(mpf(2)))) / 2)
        for low, high in ((near, far), (-far, -near)):
            answer = ask(NORMAL, above=float(low), at_most=float(high))
            assert answer.probability == 0
            assert answer.log_probability == pytest.approx(float(exact), rel=1e-14, abs=0)


def test_narrow_intervals_of_a_discrete_law_sum_masses() -> None:
    asked = law("binomial", trials=1e12, success_probability=0.3)
    centre = 3e11
    three = ask(asked, above=centre - 2, below=centre + 2).probability
    masses = sum(asked.density(number(centre + k)) for k in (-1, 0, 1))
    assert three == pytest.approx(float(masses), rel=1e-13, abs=0)
    many = ask(asked, above=centre - 100, below=centre + 100).probability
    assert many == pytest.approx(199 * float(asked.density(number(centre))), rel=1e-6, abs=0)


def test_a_kink_inside_a_narrow_interval_does_no_harm() -> None:
    asked = law("uniform", lower=0, upper=1)
    answer = ask(asked, above=0.999, at_most=1.5)
    assert answer.probability == pytest.approx(1e-3, rel=1e-12, abs=0)
    jump = ask(law("exponential", rate=1), above=-1.0, at_most=1e-9)
    assert jump.probability == pytest.approx(1e-9, rel=1e-9, abs=0)


def test_an_interval_of_observations_is_counted() -> None:
    asked = law("empirical", observations=[0.1 * k for k in range(100)])
    assert ask(asked, above=8.95, at_most=9.05).probability == pytest.approx(0.01, rel=1e-14, abs=0)
    assert ask(asked, exactly=0.5).probability == 0.01


def test_exactly_one_value_of_a_continuous_law_never_happens() -> None:
    answer = ask(NORMAL, exactly=0.3)
    assert plain(answer.probability, answer.complement) == (0, 1)
    assert plain(answer.log_probability, answer.log_complement) == (-np.inf, 0)
    assert answer.lower_score == answer.upper_score == pytest.approx(0.3)


def test_exactly_counts_a_mass_far_out_in_logarithms() -> None:
    asked = law("binomial", trials=1e6, success_probability=0.5)
    answer = ask(asked, exactly=0.0)
    assert answer.probability == 0
    assert answer.log_probability == pytest.approx(1e6 * np.log(0.5), rel=1e-14, abs=0)
    sure = ask(law("bernoulli", success_probability=1 - 2**-40), exactly=1.0)
    assert sure.complement == 2**-40
    assert sure.log_complement == pytest.approx(-40 * np.log(2), rel=1e-15, abs=0)


@pytest.mark.parametrize(
    ("count", "share"), [(1, 0.6826894921370859), (2, 0.9544997361036416), (3, 0.9973002039367398)]
)
def test_within_standard_deviations_of_a_normal(count: int, share: float) -> None:
    answer = ask(law("normal", mean=7, standard_deviation=0.3), within_standard_deviations=float(count))
    assert answer.probability == pytest.approx(share, rel=1e-14, abs=0)
    assert answer.complement == pytest.approx(float(erfc(count / sqrt(mpf(2)))), rel=1e-12, abs=0)
    assert plain(answer.lower_score, answer.upper_score) == (-count, count)


def test_within_includes_a_lattice_point_at_its_end() -> None:
    # mean 2.5, standard deviation 1.5 (25 trials at 0.1): one standard deviation reaches exactly 1 and 4
    asked = law("binomial", trials=25, success_probability=0.1)
    expected = sum(float(asked.density(number(k))) for k in (1.0, 2.0, 3.0, 4.0))
    assert ask(asked, within_standard_deviations=1.0).probability == pytest.approx(expected, rel=1e-14, abs=0)


def test_within_of_a_sure_value_is_certain() -> None:
    for asked in (
        law("bernoulli", success_probability=0),
        law("binomial", trials=0, success_probability=0.5),
        law("discrete_uniform", lowest=3, highest=3),
        law("empirical", observations=[0.1, 0.1, 0.1]),
    ):
        answer = ask(asked, within_standard_deviations=1.0)
        assert plain(answer.probability, answer.complement) == (1, 0)


def test_without_a_standard_deviation_no_score_and_no_within() -> None:
    asked = law("student_t", degrees_of_freedom=[0.5, 1.5, 3], location=0, scale=1)
    answer = ask(asked, at_most=1.0)
    assert answer.upper_score is not None
    assert np.isnan(answer.upper_score).tolist() == [True, True, False]
    assert np.isfinite(answer.probability).all()
    near = ask(asked, within_standard_deviations=1.0)
    for figure in near:
        assert figure is not None
        assert np.isnan(figure).tolist() == [True, True, False]


def test_bounds_and_parameters_broadcast() -> None:
    asked = law("normal", mean=[0, 1, 2], standard_deviation=1)
    answer = ask(asked, above=[-1, 0, 1], at_most=3.0)
    for i, mean in enumerate((0, 1, 2)):
        alone = ask(law("normal", mean=mean, standard_deviation=1), above=float(mean - 1), at_most=3.0)
        for together, single in zip(answer, alone, strict=True):
            assert together is not None
            assert single is not None
            assert together[i] == single
    wide = ask(
        asked,
        above=-1.0,
        at_most=1.0,
    )
    assert wide.probability.shape == (3,)


@pytest.mark.parametrize(
    ("bounds", "code", "path"),
    [
        ({}, "no_event", ()),
        ({"above": 1.0, "at_least": 1.0}, "bounds_do_not_go_together", ()),
        ({"below": 1.0, "at_most": 2.0}, "bounds_do_not_go_together", ()),
        ({"exactly": 1.0, "below": 2.0}, "bounds_do_not_go_together", ()),
        ({"within_standard_deviations": 1.0, "above": 2.0}, "bounds_do_not_go_together", ()),
        ({"within_standard_deviations": 1.0, "exactly": 2.0}, "bounds_do_not_go_together", ()),
        ({"above": 2.0, "below": 1.0}, "bounds_crossed", ("below",)),
        ({"at_least": [0, 2], "at_most": [1, 1]}, "bounds_crossed", ("at_most", 1)),
        ({"at_least": [0, 2], "at_most": 1.0}, "bounds_crossed", ("at_most",)),
        ({"within_standard_deviations": -0.5}, "must_not_be_negative", ("within_standard_deviations",)),
        ({"within_standard_deviations": [1, -2]}, "must_not_be_negative", ("within_standard_deviations", 1)),
    ],
)
def test_bounds_that_make_no_event_are_refused(bounds: Mapping[str, Any], code: str, path: tuple[Any, ...]) -> None:
    with pytest.raises(DoesNotFit) as refused:
        ask(NORMAL, **bounds)
    (refusal,) = refused.value.refusals
    assert (refusal.code, refusal.path) == (code, path)


def test_a_crossing_names_both_bounds() -> None:
    with pytest.raises(DoesNotFit, match=r"below \(1\) lies below above \(2\)") as refused:
        ask(NORMAL, above=2.0, below=1.0)
    assert refused.value.refusals[0].params == {"above": 2.0, "below": 1.0}
