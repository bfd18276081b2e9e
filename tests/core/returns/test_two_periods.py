"""Two periods by brute force: the law of one given the other, integrated over the other."""

from collections.abc import Callable
from typing import Any

import mpmath as mp
import numpy as np
import pytest

from service.core.arrays import Numbers, number
from service.core.distributions.kernels.cornish_fisher import Expansion, inverse
from service.core.returns import HorizonLaw
from service.core.returns.compounding.nodes_normal import NormalPart
from service.core.returns.laws.student_t import scale_of_t
from service.core.returns.matched_moments import least_and_most_excess
from tests.core.returns import exact
from tests.core.returns.build import law

THRESHOLDS = (-0.3, 0.0, 0.4)
NODES, WEIGHTS = np.polynomial.legendre.leggauss(16)


def normal_chance(mean: Any, deviation: Any) -> tuple[Callable[[Any], Any], Callable[[Any], Any]]:
    """Density and distribution function of a normal return, with mpmath."""
    m, v = mp.mpf(mean), mp.mpf(deviation)
    return lambda y: exact.density((y - m) / v) / v, lambda y: exact.at_most((y - m) / v)


def t_chance(mean: Any, deviation: Any, freedom: Any) -> tuple[Callable[[Any], Any], Callable[[Any], Any]]:
    """The same for a scaled Student t."""
    m, s = mp.mpf(mean), mp.mpf(deviation) * mp.sqrt((mp.mpf(freedom) - 2) / freedom)
    return lambda y: exact.t_density(freedom, (y - m) / s) / s, lambda y: exact.t_at_most(freedom, (y - m) / s)


def two_periods(chance: tuple[Callable[[Any], Any], Callable[[Any], Any]], threshold: float) -> Any:
    """P(G_1 G_2 < 1 + threshold), total losses included."""
    density, at_most = chance
    k = 1 + mp.mpf(threshold)
    places = [mp.mpf(p) for p in ("1e-6", "0.02", "0.2", "0.6", "0.85", "1.05", "1.3", "1.7", "2.5", "5", "30", "1000")]
    integral = mp.quad(lambda g: density(g - 1) * at_most(k / g - 1), places)
    # closer to a total loss the other factor never brings back the floor; further out no law here reaches
    return at_most(mp.mpf(-1)) + integral + (at_most(places[0] - 1) - at_most(mp.mpf(-1)))


@pytest.mark.parametrize("threshold", THRESHOLDS)
def test_normal_returns(threshold: float) -> None:
    mp.mp.dps = 18
    found = law("normal", expected_return=0.07, volatility=0.25, horizon_years=2)
    expected = two_periods(normal_chance(0.07, 0.25), threshold)
    assert float(found.probability_below(number(threshold)) - expected) == pytest.approx(0, abs=1e-12)


@pytest.mark.parametrize("threshold", THRESHOLDS[:2])
def test_student_t_returns(threshold: float) -> None:
    mp.mp.dps = 16
    found = law("student_t", expected_return=0.07, volatility=0.2, degrees_of_freedom=9, horizon_years=2)
    expected = two_periods(t_chance(0.07, 0.2, 9), threshold)
    assert float(found.probability_below(number(threshold)) - expected) == pytest.approx(0, abs=1e-12)


@pytest.mark.parametrize("threshold", THRESHOLDS)
def test_mixed_normal_returns(threshold: float) -> None:
    mp.mp.dps = 18
    calm, storm = normal_chance(0.08, 0.12), normal_chance(-0.1, 0.35)
    weights = mp.mpf(9) / 10, mp.mpf(1) / 10

    def mixed(side: int) -> Callable[[Any], Any]:
        return lambda y: weights[0] * calm[side](y) + weights[1] * storm[side](y)

    components = [
        {"weight": 0.9, "expected_return": 0.08, "volatility": 0.12},
        {"weight": 0.1, "expected_return": -0.1, "volatility": 0.35},
    ]
    found = law("normal_mixture", components=components, horizon_years=2)
    expected = two_periods((mixed(0), mixed(1)), threshold)
    assert float(found.probability_below(number(threshold)) - expected) == pytest.approx(0, abs=1e-12)


def test_cornish_fisher_returns() -> None:
    """Over the score of the first period; the second's distribution function by the root of the cubic."""
    mp.mp.dps = 18
    m, v, s, k = (mp.mpf(x) for x in ("0.07", "0.2", "-0.5", "2"))

    def bent(z: Any) -> Any:
        return z + (z * z - 1) * s / 6 + (z**3 - 3 * z) * k / 24 - (2 * z**3 - 5 * z) * s * s / 36

    def score(y: Any) -> Any:
        square = s * s / 36
        shifted = -s / 6 - (y - m) / v
        roots = mp.polyroots(
            [shifted, 1 - k / 8 + 5 * square, s / 6, k / 24 - 2 * square], asc=True, maxsteps=200, extraprec=80
        )
        return min(roots, key=lambda root: abs(mp.im(root))).real

    loss_at = score(mp.mpf(-1))
    below = exact.at_most(loss_at)
    floor = mp.mpf("0.7")
    places = [loss_at + mp.mpf(d) for d in ("1e-12", "0.01", "0.1", "0.4", "1", "1.8", "2.8", "4", "5.5", "7.5", "13")]
    integral = mp.quad(lambda z: exact.density(z) * exact.at_most(score(floor / (1 + m + v * bent(z)) - 1)), places)
    found = law(
        "cornish_fisher", expected_return=0.07, volatility=0.2, skewness=-0.5, excess_kurtosis=2, horizon_years=2
    )
    assert float(found.probability_below(number(-0.3)) - below - integral) == pytest.approx(0, abs=1e-12)


# Every order at once and for parameters at random, with numpy: a dense rule for the first period, and for the second
# the closed forms of one period, which have tests of their own.


def floored_gaps(one: HorizonLaw, growth: Numbers) -> Numbers:
    """E[max(K - max(G, 0), 0)^j] of one period for j = 0, 1, 2."""
    gap, square_gap = one.gaps(growth - 1)
    loss_gap, square_loss_gap = one.gaps(number(-1))
    return np.array(
        [one.probability_below(growth - 1), gap - loss_gap, square_gap - 2 * growth * loss_gap - square_loss_gap]
    )


def integrated(one: HorizonLaw, growth: Numbers, weights: Numbers, k: float) -> Numbers:
    """E[max(K - G_1 G_2, 0)^j] from nodes of the first factor above 0."""
    powers = growth ** np.arange(3)[:, np.newaxis]
    lost = float(one.total_loss_probability()) * k ** np.arange(3)
    found: Numbers = lost + (weights * powers * floored_gaps(one, k / growth)).sum(axis=1)
    return found


def panels(edges: Numbers) -> tuple[Numbers, Numbers]:
    """Gauss-Legendre nodes and weights on every panel."""
    half = np.diff(edges)[:, np.newaxis] / 2
    return (edges[:-1, np.newaxis] + half * (NODES + 1)).ravel(), (half * WEIGHTS).ravel()


def bent_nodes(mean: float, deviation: float, expansion: Expansion, panels_a_unit: int = 1) -> tuple[Numbers, Numbers]:
    """Growth factors and weights over the score, finer towards a total loss."""
    loss_at = float(inverse(number(-(1 + mean) / deviation), expansion))
    start = max(loss_at, -9.5)
    t, width = panels(
        np.concatenate(
            [[0], np.geomspace(1e-13, 1, 60 * panels_a_unit), np.linspace(1, 9.5 - start, 60 * panels_a_unit)[1:]]
        )
    )
    z = start + t
    growth = 1 + mean + deviation * expansion.value(z)
    if start == loss_at:
        growth = (
            deviation
            * t
            * (expansion.slope(number(start)) + t * (expansion.c2 + 3 * expansion.c3 * start) + expansion.c3 * t * t)
        )
    return growth, width * np.exp(-z * z / 2) / np.sqrt(2 * np.pi)


def t_nodes(mean: float, scale: float, freedom: float) -> tuple[Numbers, Numbers]:
    """The same for Student's t, over the inverse hyperbolic sine of the score, and its logarithm far out."""
    a = (1 + mean) / scale
    left, left_width = panels(np.concatenate([[0], a * np.geomspace(1e-13, 1, 80)]))
    bent, right_width = panels(np.linspace(0, np.arcsinh(1e13 ** min(1, 8 / freedom)), 120))
    z = np.concatenate([left - a, np.sinh(bent)])
    width = np.concatenate([left_width, right_width * np.cosh(bent)])
    if a > 12:  # the centre of the law lies within the left part
        inner, inner_width = panels(np.linspace(-np.arcsinh(a), 0, 200))
        z = np.concatenate([np.sinh(inner), np.sinh(bent)])
        width = np.concatenate([inner_width * np.cosh(inner), right_width * np.cosh(bent)])
    scale_of_density = float(
        mp.exp(mp.loggamma((freedom + 1) / 2) - mp.loggamma(freedom / 2)) / mp.sqrt(freedom * mp.pi)
    )
    growth = scale * np.concatenate([left, np.sinh(bent) + a]) if a <= 12 else scale * (z + a)
    weights = width * scale_of_density * np.exp(-(freedom + 1) / 2 * np.log1p(z * z / freedom))
    return growth[growth > 0], weights[growth > 0]


def random_case(seed: int) -> tuple[dict[str, Any], Numbers, Numbers]:
    """A model at random, with growth factors and weights of one period."""
    random = np.random.default_rng(seed)
    deviation = float(10 ** random.uniform(-1.7, 0))
    mean = float(random.uniform(-0.3, 0.3) * min(1, 3 * deviation))
    base = {"expected_return": mean, "volatility": deviation}
    kind = ("normal", "student_t", "cornish_fisher", "normal_mixture")[seed % 4]
    straight = Expansion.of(number(0), number(0))
    if kind == "normal":
        return {"model": kind, **base}, *bent_nodes(mean, deviation, straight)
    if kind == "student_t":
        freedom = float(2.1 + 10 ** random.uniform(-0.5, 2))
        scale = float(scale_of_t(number(freedom), number(deviation)))
        return {"model": kind, **base, "degrees_of_freedom": freedom}, *t_nodes(mean, scale, freedom)
    if kind == "cornish_fisher":
        skewness = float(random.uniform(-1.5, 1.5))
        least, most = least_and_most_excess(number(skewness))
        excess = float(least + (most - least) * random.uniform(0.15, 0.8))
        expansion = Expansion.of(number(skewness), number(excess))
        shape = {"skewness": skewness, "excess_kurtosis": excess}
        return {"model": kind, **base, **shape}, *bent_nodes(mean, deviation, expansion, 20)
    other = float(deviation * 10 ** random.uniform(-0.7, 0.3))
    components = [
        {"weight": 0.7, "expected_return": mean, "volatility": deviation},
        {"weight": 0.3, "expected_return": -mean, "volatility": other},
    ]
    first, second = bent_nodes(mean, deviation, straight), bent_nodes(-mean, other, straight)
    growth = np.concatenate([first[0], second[0]])
    return {"model": kind, "components": components}, growth, np.concatenate([0.7 * first[1], 0.3 * second[1]])


@pytest.mark.parametrize("seed", range(48))
def test_the_stated_error_holds_for_parameters_at_random(seed: int) -> None:
    given, growth, weights = random_case(seed)
    one, found = law(**given), law(**given, horizon_years=2)
    assert found.numerical_error < 1e-9
    body = float(found.standard_deviation())
    for threshold in (float(found.mean()) - 2 * body, float(found.mean()) - 0.3 * body, float(found.mean()) + body):
        k = max(1 + threshold, 0.05)
        expected = integrated(one, growth, weights, k)
        gaps = found.gaps(number(k - 1))
        figures = np.array([found.probability_below(number(k - 1)), gaps.order_1, gaps.order_2])
        allowed = found.numerical_error * k ** np.arange(3) + 1e-13 * (1 + k) ** 2
        assert (np.abs(figures - expected) <= allowed).all(), (given, figures - expected)


def test_the_law_of_a_component_starts_where_it_is_told() -> None:
    part = NormalPart(number(0.1), number(0.3), weight=0.25)
    _, weights = part.nodes(0.0)
    assert float(weights.sum() + part.zero_probability) == pytest.approx(0.25, abs=1e-15)
