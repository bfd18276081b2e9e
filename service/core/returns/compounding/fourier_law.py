"""The law of the growth over n periods by Fourier inversion."""

from dataclasses import replace

import numpy as np

from service.core.arrays import NO_VALUE, Numbers, Truths, number
from service.core.returns.compounding.compositions import compositions, count_of_compositions
from service.core.returns.compounding.grid import UNFOLDED, Band, Grid, band_of
from service.core.returns.compounding.quantiles import QuantileTable
from service.core.returns.compounding.step import Step
from service.core.returns.compounding.window import TAIL, Window, window_of
from service.core.returns.law import COINCIDENCE, Gaps, HorizonLaw, LogGrowth, log_growth_factor
from service.core.returns.laws.atoms import LEVEL_TIE
from service.core.returns.work import OF_A_LAW, not_accurate_enough, thresholds_beyond, too_much_work

OTHER_STRETCH = 1.19
SAFETY = 3.0
SAFETY_UNRESOLVED = 5.0
AROUND_PEAK = np.array([-8.0, -4, -2, -1, 0, 1, 2, 4, 8])
"""Places about a peak of the density to compare at, in wave lengths of the highest frequency over 2 pi."""
MOST_ATOMS = 200_000
MOST_TERMS = 3e8
LEAST_ACCURACY = 1e-2
EVALUATIONS = 1e3
"""Places at which a law in a ranking is looked at."""
COMPARED_AT = np.sin(np.linspace(-np.pi / 2, np.pi / 2, 33))


class FourierLaw(HorizonLaw):
    """R = G_1 ... G_n - 1 for n independent growth factors of one law, each 0 or above.

    P(R = -1) and the listed values of log growth are exact, the rest comes from a grid of frequencies (see `Grid`). A
    second grid, a fifth longer and higher, gives the stated error: three times the greatest difference over the window
    (where the transform does not come to rest, five times that of a grid half as high), the lost mass, and 2e-12 at
    each end. It is that of probabilities and of gaps as a share of the growth factor.
    """

    method = "fourier_inversion"
    numerical_error_kind = "estimate"

    def __init__(self, step: Step, periods: int) -> None:
        self._growth, self._periods = step.growth, number(periods)
        self.cautions = step.growth.cautions(self._periods)
        self._places, masses = _listed(step, periods)
        powers = [masses * np.exp(j * self._places) for j in range(3)]
        self._sums = np.cumsum(np.pad(powers, ((0, 0), (1, 0))), axis=1)
        self._closeness = COINCIDENCE * (1 + periods * float(np.abs(step.values).max(initial=0.0)))
        window = window_of(step, periods)
        self._origin = periods * window.centre
        grids = self._grids(step, periods, window)
        self._grid = grids[0]
        self._table = QuantileTable(self._grid)
        if self.numerical_error > LEAST_ACCURACY:
            raise not_accurate_enough(self.numerical_error, LEAST_ACCURACY)
        self.work = OF_A_LAW + sum(grid.work for grid in grids) + EVALUATIONS * self._grid.frequencies.size

    def _grids(self, step: Step, periods: int, window: Window) -> tuple[Grid, Grid]:
        band = band_of(step, periods, window)
        # where the transform does not come to rest, the error falls slowly with the frequencies: half of them show it
        other = band if band.resolved else replace(band, highest=band.highest / 2)
        first = Grid(step, periods, window, band, 1.0, not band.resolved)
        second = Grid(step, periods, window, other, OTHER_STRETCH, not band.resolved)
        self.numerical_error = self._stated(step, periods, window, (first, second), band)
        return first, second

    def _stated(self, step: Step, periods: int, window: Window, grids: tuple[Grid, Grid], band: Band) -> float:
        """Give the error that the difference of two grids and the mass show."""
        beside = AROUND_PEAK / grids[0].highest
        sharp = [np.add.outer(periods * (part.sharp_places() - window.centre), beside).ravel() for part in step.parts]
        middle, half = (window.low + window.high) / 2, window.width / 2
        body = 4 * window.deviation * np.sqrt(periods) * COMPARED_AT
        compared = np.concatenate([middle + half * COMPARED_AT, body, *sharp])
        first, second = (grid.relative_gaps(compared) for grid in grids)
        difference = float(np.abs(first - second).max())
        factor = SAFETY if band.resolved else SAFETY_UNRESOLVED
        alive = grids[0].alive + float(self._sums[0, -1])
        lost = abs(alive - float(1 - self._growth.total_loss(self._periods)))
        return factor * difference + lost + 2 * TAIL + 3e-14 + (10 * UNFOLDED if band.lattice else 3e-16) * periods

    def mean(self) -> Numbers:
        return self._growth.moments(self._periods)[0]

    def standard_deviation(self) -> Numbers:
        return self._growth.moments(self._periods)[1]

    def _partial(self, threshold: Numbers) -> Numbers:
        """Give g_0, g_1, g_2 at the thresholds made flat, of everything, total losses included."""
        flat = np.ravel(threshold)
        if flat.size * self._grid.frequencies.size > MOST_TERMS:
            raise thresholds_beyond(flat.size, int(MOST_TERMS) // self._grid.frequencies.size)
        found = np.zeros((3, flat.size))
        above = np.flatnonzero(flat > -1)
        k = log_growth_factor(flat[above])
        smooth = self._grid.relative_gaps(k - self._origin)
        found[:, above] = np.minimum(smooth + self._gaps_of_listed(k) + self.total_loss_probability(), 1.0)
        return found

    def _gaps_of_listed(self, k: Numbers) -> Numbers:
        """The part of the listed values in g_0, g_1, g_2."""
        none, once, twice = self._sums[:, np.searchsorted(self._places, k - self._closeness)]
        growth = np.exp(-k)
        once, twice = once * growth, twice * growth * growth
        return np.array([none, np.maximum(none - once, 0.0), np.maximum(none - 2 * once + twice, 0.0)])

    def _listed_up_to(self, k: Numbers) -> Numbers:
        return np.asarray(self._sums[0, np.searchsorted(self._places, k + self._closeness, side="right")])

    def probability_below(self, threshold: Numbers) -> Numbers:
        found: Numbers = self._partial(threshold)[0]
        return found.reshape(np.shape(threshold))[()]

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        k = np.ravel(log_growth_factor(threshold))
        at = self._listed_up_to(k) - self._sums[0, np.searchsorted(self._places, k - self._closeness)]
        at = at + np.where(np.ravel(threshold) == -1, self.total_loss_probability(), 0.0)
        found: Numbers = np.minimum(self._partial(threshold)[0] + at, 1.0)
        return found.reshape(np.shape(threshold))[()]

    def certain(self, threshold: Numbers) -> Truths:
        return np.asarray(threshold <= -1)

    def gaps(self, threshold: Numbers) -> Gaps:
        _, first, second = self._partial(threshold).reshape(3, *np.shape(threshold))
        growth = np.maximum(1 + threshold, 0.0)
        return Gaps(growth * first, growth * (growth * second))

    def quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, -1)

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._reaching(probability, 1)

    def _reaching(self, probability: Numbers, side: int) -> Numbers:
        lost = self.total_loss_probability()
        listed = self._places.size > 0
        level = np.ravel(probability) + (side * LEVEL_TIE if listed else 0.0)
        up_to = (lambda k: self._listed_up_to(k + self._origin)) if listed else None
        found = np.expm1(self._table.reaching(level - lost, up_to) + self._origin)
        return np.where(level <= lost, -1.0, found).reshape(np.shape(probability))[()]

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        # any quantile serves: E[max(q - R, 0)]/a - q
        quantile = self.quantile(probability)
        loss = self.gaps(quantile).order_1 / probability - quantile
        return np.where(np.isfinite(self.mean()), loss, NO_VALUE)[()]

    def log_growth(self) -> LogGrowth:
        return self._growth.log_moments(self._periods)

    def total_loss_probability(self) -> Numbers:
        return self._growth.total_loss(self._periods)


def _listed(step: Step, periods: int) -> tuple[Numbers, Numbers]:
    """Values of log growth that have a probability of their own, in rising order, and these probabilities."""
    if not step.values.size:
        return np.zeros(0), np.zeros(0)
    count = count_of_compositions(periods, step.values.size)
    if count > MOST_ATOMS:
        detail = (
            f"Components without volatility have {count} outcomes over the horizon; at most {MOST_ATOMS} are listed."
        )
        raise too_much_work(("horizon_years",), detail, count, MOST_ATOMS)
    total = step.masses.sum()
    masses, (places,) = compositions(periods, step.masses / total, [step.values])
    order = np.argsort(places)
    return places[order], masses[order] * total**periods
