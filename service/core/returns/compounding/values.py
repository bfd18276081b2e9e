"""Growth by factors that take finitely many values."""

import numpy as np
from scipy.special import gammaln

from service.core.arrays import MINUS_INFINITY, Numbers, number
from service.core.returns.compounding.compositions import compositions, count_of_compositions
from service.core.returns.compounding.fourier_law import FourierLaw
from service.core.returns.compounding.grid import Band, Grid, band_of
from service.core.returns.compounding.growth import growth_of_values
from service.core.returns.compounding.halves import MOST_IN_HALF, HalvesLaw
from service.core.returns.compounding.listed import MOST_LISTED, listed_law, point
from service.core.returns.compounding.step import Step, ValuesPart
from service.core.returns.compounding.window import Window
from service.core.returns.law import HorizonLaw

MOST_FREQUENCIES = 8192
FEWEST_FREQUENCIES = 2048
MOST_TERMS = 1.2e7
UNNOTICED = 1e-19
NOTICEABLE = 1e-9
EXACT_COLLISIONS_TO = 300


def law_of_values(logs: Numbers, masses: Numbers, periods: int) -> HorizonLaw:
    """Give the law of the growth over n periods; `logs` are those of one factor, -inf a total loss.

    All outcomes listed up to 200,000; by two halves where each has up to 40,000; else approximated by Fourier
    inversion, its error stated.
    """
    growth = growth_of_values(logs, masses)
    values, places = np.unique(logs, return_inverse=True)
    masses = np.asarray(np.bincount(places, masses), np.float64)
    if np.isinf(values[0]):
        values, masses = values[1:], masses[1:]
    if values.size == 0:
        return point(MINUS_INFINITY, growth, number(periods))
    if count_of_compositions(periods, values.size) <= MOST_LISTED:
        total = masses.sum()
        found, (sums,) = compositions(periods, masses / total, [values])
        lost = growth.total_loss(number(periods))
        if lost > 0:
            found, sums = np.append(found * total**periods, lost), np.append(sums, -np.inf)
        return listed_law(sums, found, growth, number(periods), periods * float(np.abs(values).max()))
    step = Step((ValuesPart(values, masses),), growth)
    if count_of_compositions(periods - periods // 2, values.size) <= MOST_IN_HALF:
        return HalvesLaw(values, masses, growth, periods, lambda: ValuesLaw(step, periods))
    return ValuesLaw(step, periods)


class ValuesLaw(FourierLaw):
    """The same for many values, too many sums to tell apart, as if their law were smooth.

    The transform of a discrete law never comes to rest, so it is followed to some thousand frequencies with a smooth
    end. What is neglected has, in the mean square, the size of the collisions: the probability that two such growths
    are equal. Six times its root is stated, beside what two grids show (7 to 55 times the true error in trials).
    """

    discrete = True

    def _grids(self, step: Step, periods: int, window: Window) -> tuple[Grid, Grid]:
        (part,) = step.parts
        _, masses = part.nodes(0.0)
        shares = masses / masses.sum()
        collisions = np.exp(log_collisions(1 / float(shares @ shares), periods))
        band = _band(step, periods, window, masses.size, collisions > UNNOTICED)
        first = Grid(step, periods, window, band, 1.0, not band.resolved)
        second = Grid(step, periods, window, band, 1.19, not band.resolved)
        noise = 6 * np.sqrt(4 * collisions / (first.highest * window.width / 16))
        self.numerical_error = float(noise) + self._stated(step, periods, window, (first, second), band)
        if self.numerical_error > NOTICEABLE:
            self.cautions = (*self.cautions, "discrete_law_approximated")
        return first, second


def _band(step: Step, periods: int, window: Window, values: int, forced: bool) -> Band:
    """Frequencies up to the number that the work allows, or to where the transform comes to rest for good."""
    most = int(np.clip(MOST_TERMS / values, FEWEST_FREQUENCIES, MOST_FREQUENCIES))
    farthest = most * 2 * np.pi / window.width
    band = Band(farthest, (np.inf,), resolved=False) if forced else band_of(step, periods, window)
    return band if band.highest < farthest else Band(farthest, (np.inf,), resolved=False)


def log_collisions(values: float, periods: int) -> float:
    """Logarithm of the probability that two sums of n of k equally likely values in general position are equal.

    (n!)^2 [y^n] I_0(2 sqrt(y))^k / k^(2n) by the recurrence for powers of a series; from n = 2k on by the normal law.
    """
    k = values
    if periods >= 2 * k or periods > EXACT_COLLISIONS_TO:
        return min(0.0, float(0.5 * np.log(k) + (k - 1) / 2 * np.log(k / (4 * np.pi * periods))))
    unit = 2 * (np.log(periods) - 1 - np.log(k))  # keeps the terms within the doubles
    i = np.arange(periods + 1.0)
    terms = np.exp(np.clip(i * unit - 2 * gammaln(i + 1), -700, 700))
    power = np.zeros(periods + 1)
    power[0] = 1.0
    for m in range(1, periods + 1):
        j = np.arange(1, m + 1)
        power[m] = ((k * j - m + j) * terms[1 : m + 1]) @ power[m - 1 :: -1][:m] / m
    scale = 2 * (gammaln(periods + 1) - periods * np.log(k)) - periods * unit
    return float(np.log(np.maximum(power[periods], 1e-300)) + scale)
