"""Laws that every family obeys, at parameters drawn around its declared examples."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.core.arrays import Numbers, number
from service.core.distributions import FAMILIES, Event, Family, chances, quantile
from service.core.distributions.kernels.quadrature import MEDIUM
from service.core.parameters import Parameter
from tests.core.distributions.laws import law, laws, plain, values

EVERY_FAMILY = pytest.mark.parametrize("kind", FAMILIES.values(), ids=str)
FEW = settings(max_examples=15, deadline=None, derandomize=True)
PROBABILITIES = st.floats(1e-6, 1) | st.floats(0, 300).map(lambda power: 10.0**-power)
INNER = PROBABILITIES.filter(lambda p: 0 < p < 1)
LEVELS = np.concatenate([10.0 ** -np.arange(26.0, 0.9, -0.125), np.arange(0.15, 0.5, 0.05)])
EPS = np.finfo(np.float64).eps


@pytest.fixture(autouse=True)
def _quiet() -> Any:
    """The callers of the families silence numpy; here these tests are the caller."""
    with np.errstate(all="ignore"):
        yield


def support_points(asked: Family) -> Numbers:
    """Quantiles that cut the law into pieces, and its mode, where a density may have a kink; no poles of it."""
    both = [asked.quantile(LEVELS, upper=False), asked.quantile(LEVELS[::-1], upper=True)]
    points = np.concatenate([*both, np.atleast_1d(asked.most_likely())])
    return np.unique(points[np.isfinite(points) & np.isfinite(asked.density(points))])


def integrals(asked: Family, points: Numbers) -> tuple[Numbers, Numbers]:
    """Places and weights (density times width) that integrate a function under the law over the pieces."""
    if asked.discrete:
        places = np.arange(points[0], points[-1] + 1)
        return places, asked.density(places)
    width = np.diff(points)
    places = points[:-1] + MEDIUM.over(width)
    return places.ravel(), (MEDIUM.weights[:, None] * width * asked.density(places)).ravel()


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_tails_add_to_one_and_agree_with_their_logarithms(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    x = asked.quantile(number(data.draw(INNER)), upper=data.draw(st.booleans()))
    tails, logs = asked.tails_and_logs(x)
    assert tails.at_most + tails.above == pytest.approx(1, rel=4 * EPS, abs=0)
    for probability, logarithm in zip(tails, logs, strict=True):
        assert np.exp(logarithm) == pytest.approx(float(probability), rel=1e-12, abs=1e-307)
    again = (asked.tails(x), asked.log_tails(x))
    for first, second in zip(again, (tails, logs), strict=True):
        assert first == pytest.approx(second, rel=4 * EPS, abs=1e-307)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_tails_are_monotone(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    x = np.sort(asked.quantile(np.sort(np.array(data.draw(st.lists(INNER, min_size=8, max_size=8)))), upper=False))
    at_most, above = (np.maximum(log, -1e9) for log in asked.log_tails(x))
    slack = 1e-13 * (1 - np.minimum(at_most, above)[1:])
    assert (np.diff(at_most) >= -slack).all()
    assert (np.diff(above) <= slack).all()
    assert (asked.density(x) >= 0).all()


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_the_quantile_inverts_both_tails(kind: type[Family], data: st.DataObject) -> None:
    asked, p, upper = data.draw(laws(kind)), data.draw(INNER), data.draw(st.booleans())
    x, reached = quantile(asked, number(p), upper)
    if not 1e-300 < np.abs(x) < np.inf and not asked.discrete:
        return  # beyond the doubles, at either end
    if not asked.discrete:
        # the tail passes p within a few of the doubles beside x, or of those at the size of the law's spread
        spread = asked.moments().standard_deviation
        beside = spread if asked.support().lower < 0 and np.isfinite(spread) else 0
        step = 4 * EPS * max(abs(float(x)), float(beside))
        less, more = (getattr(asked.tails(x + side * step), "above" if upper else "at_most") for side in (-1, 1))
        assert min(less, more, reached) <= p * (1 + 1e-11)
        assert max(less, more, reached) >= p * (1 - 1e-11)
        return
    before = asked.tails(np.nextafter(x, -np.inf))
    slack = 1e-12 if kind.quantile_method == "counting" else 0
    if upper:
        assert reached <= p * (1 + 2e-12) + slack
        assert before.above > p * (1 - 2e-12)
    else:
        assert reached >= p * (1 - 2e-12) - slack
        assert before.at_most < p * (1 + 2e-12)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_intervals_lie_between_the_tails(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    first, last = sorted(data.draw(st.lists(INNER, min_size=2, max_size=2)))
    low, high = (float(asked.quantile(number(p), upper=False)) for p in (first, last))
    if not np.isfinite([low, high]).all():
        return
    inside = chances(asked, Event.of({"above": low, "at_most": high}))
    below, above = asked.tails(number(low)).at_most, asked.tails(number(high)).above
    assert inside.probability + below + above == pytest.approx(1, rel=1e-12, abs=0)
    assert inside.complement == pytest.approx(float(below + above), rel=1e-13, abs=0)
    assert np.exp(inside.log_probability) == pytest.approx(float(inside.probability), rel=1e-11, abs=1e-307)
    assert np.exp(inside.log_complement) == pytest.approx(float(inside.complement), rel=1e-11, abs=1e-307)
    single = chances(asked, Event.of({"exactly": high}))
    closed = chances(asked, Event.of({"at_least": high, "at_most": high}))
    assert single.probability == pytest.approx(float(closed.probability), rel=1e-9, abs=1e-300)
    assert single.probability + single.complement == pytest.approx(1, rel=1e-12, abs=0)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_the_density_adds_up_to_the_tails(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    points = support_points(asked)
    if asked.discrete:
        at, before = asked.tails(points), asked.tails(np.nextafter(points, -np.inf))
        lower, upper = at.at_most - before.at_most, before.above - at.above
        assert asked.density(points) == pytest.approx(np.where(at.at_most < 0.5, lower, upper), rel=1e-10, abs=1e-16)
        assert asked.density(points + 0.5).max() == 0
        return
    places, weights = integrals(asked, points)
    pieces = weights.reshape(places.size // (points.size - 1), -1).sum(axis=0)
    tails = asked.tails(points)
    left = tails.at_most[1:] < 0.5
    exact = np.where(left, np.diff(tails.at_most), -np.diff(tails.above))
    rounding = 4 * EPS * np.abs(points) * asked.density(points)
    noise = 1e-13 * np.where(left, tails.at_most[1:], tails.above[:-1]) + rounding[1:] + rounding[:-1]
    assert (np.abs(pieces - exact) <= 1e-9 * exact + noise).all()


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_log_density_is_the_logarithm_of_the_density(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    x = support_points(asked)
    assert np.exp(asked.log_density(x)) == pytest.approx(asked.density(x), rel=1e-12, abs=1e-300)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_moments_and_entropy_are_those_of_the_density(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    points = support_points(asked)
    mean, spread, skewness, excess = asked.moments()
    if not np.isfinite(spread) or spread == 0:
        return
    outside = asked.tails(points[0]).at_most + asked.tails(points[-1]).above
    if outside > 1e-20 and not asked.discrete:
        return  # more lies between the last double and the end of the support than quadrature can miss
    places, weights = integrals(asked, points)
    scores = (places - mean) / spread
    reach = max(abs(float(scores[0])), abs(float(scores[-1])))
    for power, expected in ((1, 0), (2, 1), (3, skewness), (4, excess + 3)):
        # where the tail that is left out counts, there is nothing to compare
        if np.isfinite(expected) and reach**power * 1e-26 < 1e-10:
            assert (weights * scores**power).sum() == pytest.approx(float(expected), rel=1e-7, abs=1e-7)
    logs = np.where(weights > 0, asked.log_density(places), 0)
    assert -(weights * logs).sum() == pytest.approx(float(asked.entropy()), rel=1e-6, abs=1e-6)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_no_density_exceeds_that_at_the_mode(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    mode = asked.most_likely()
    if np.isnan(mode):
        return
    assert asked.density(support_points(asked)).max() <= asked.density(mode) * (1 + 1e-12)


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_everything_lies_within_the_support(kind: type[Family], data: st.DataObject) -> None:
    asked = data.draw(laws(kind))
    lower, upper = asked.support()
    points = support_points(asked)
    assert lower <= points[0]
    assert points[-1] <= upper
    for end, at_most in ((lower, 0), (upper, 1)):
        if np.isfinite(end):
            beyond = end - 1 if end == lower else end + 1
            beyond = beyond if lower < upper else end + (at_most or -1)
            assert plain(*asked.tails(beyond)) == (at_most, 1 - at_most)
            assert asked.density(beyond) == 0


@EVERY_FAMILY
@FEW
@given(data=st.data())
def test_arrays_give_what_single_numbers_give(kind: type[Family], data: st.DataObject) -> None:
    declared = kind.parameterisations[0]
    singles = [data.draw(laws_by_numbers(kind)) for _ in range(3)]
    stretch = {n: p for n, p in declared.parameters.items() if isinstance(p, Parameter)}
    together = kind.make(
        declared,
        {n: np.array([s[n] for s in singles]) if n in stretch else singles[0][n] for n in declared.parameters},
    )
    alone = [kind.make(declared, {n: s[n] if n in stretch else singles[0][n] for n in s}) for s in singles]
    p = np.array(data.draw(st.lists(INNER, min_size=3, max_size=3)))
    for upper in (False, True):
        same(together.quantile(p, upper), [a.quantile(number(q), upper) for a, q in zip(alone, p, strict=True)])
    x = np.array([float(a.quantile(number(q), False)) for a, q in zip(alone, p, strict=True)])
    finite = np.where(np.isfinite(x), x, 1.0)
    for question in ("log_tails", "tails"):
        for side in ("at_most", "above"):
            answer = getattr(getattr(together, question)(finite), side)
            same(answer, [getattr(getattr(a, question)(number(v)), side) for a, v in zip(alone, finite, strict=True)])
    same(together.density(finite), [a.density(number(v)) for a, v in zip(alone, finite, strict=True)])
    for side in ("mean", "standard_deviation", "skewness", "excess_kurtosis"):
        same(getattr(together.moments(), side), [getattr(a.moments(), side) for a in alone])
    same(together.entropy(), [a.entropy() for a in alone])
    same(together.most_likely(), [a.most_likely() for a in alone])


@st.composite
def laws_by_numbers(draw: st.DrawFn, kind: type[Family]) -> dict[str, Any]:
    """Parameters of a law in the first way of giving them, which keep the rules between them."""
    declared = kind.parameterisations[0]
    drawn = {n: p.as_numbers(draw(values(p))) for n, p in declared.parameters.items()}
    return draw(st.just(drawn).filter(lambda given: not any(list(rule.refusals(given)) for rule in declared.rules)))


def same(together: Numbers, alone: list[Numbers]) -> None:
    """Equal but for the last bits of differently ordered sums (the excess kurtosis is such a sum less 3)."""
    for one, other in zip(np.broadcast_to(together, (3,)), alone, strict=True):
        assert one == pytest.approx(float(other), rel=2e-14, abs=2e-14, nan_ok=True)


@pytest.mark.parametrize(
    "kind", [k for k in FAMILIES.values() if {"location", "scale"} <= set(k.parameterisations[0].parameters)], ids=str
)
@FEW
@given(data=st.data())
def test_location_and_scale_move_and_stretch(kind: type[Family], data: st.DataObject) -> None:
    drawn = data.draw(laws_by_numbers(kind))
    asked = kind.make(kind.parameterisations[0], drawn)
    standard = kind.make(kind.parameterisations[0], drawn | {"location": number(0.0), "scale": number(1.0)})
    p = number(data.draw(INNER))
    place, scale = drawn["location"], drawn["scale"]
    unmoved = float(standard.quantile(p, upper=False))
    assert asked.quantile(p, upper=False) == pytest.approx(
        float(place + scale * unmoved), rel=1e-14, abs=1e-14 * float(scale)
    )
    assert asked.entropy() == pytest.approx(float(standard.entropy() + np.log(scale)), rel=1e-13, abs=1e-13)
    assert asked.moments().skewness == pytest.approx(
        float(standard.moments().skewness), rel=1e-13, abs=1e-15, nan_ok=True
    )
    x = number(0.375)
    assert asked.density(place + scale * x) == pytest.approx(float(standard.density(x) / scale), rel=1e-12, abs=0)


def test_binomial_tends_to_poisson() -> None:
    k = np.arange(0.0, 30)
    many = law("binomial", trials=1e12, success_probability=3.5e-12)
    assert many.density(k) == pytest.approx(law("poisson", rate=3.5).density(k), rel=1e-9, abs=0)
    assert many.tails(k).above == pytest.approx(law("poisson", rate=3.5).tails(k).above, rel=1e-9, abs=0)


def test_student_t_tends_to_normal() -> None:
    x = np.array([-8, -3, -1, 0, 0.5, 2, 6])
    near, limit = law("student_t", degrees_of_freedom=1e15), law("normal", mean=0, standard_deviation=1)
    assert near.tails(x).at_most == pytest.approx(limit.tails(x).at_most, rel=1e-11, abs=0)
    assert near.density(x) == pytest.approx(limit.density(x), rel=1e-11, abs=0)
    p = np.array([1e-9, 0.2, 0.7])
    assert near.quantile(p, upper=False) == pytest.approx(limit.quantile(p, upper=False), rel=1e-12, abs=0)


def test_poisson_tends_to_normal_about_its_centre() -> None:
    asked = law("poisson", rate=1e12)
    middle = asked.tails(number(1e12)).at_most
    # Edgeworth: 1/2 + (2/3)/sqrt(2 pi rate)
    assert middle == pytest.approx(0.5 + 2 / 3 / np.sqrt(2 * np.pi * 1e12), abs=1e-13)
