"""One cash flow: from the mixture of wealth before it to points of wealth after it, by the trapezoidal rule.

In the unit of the flow wealth before it is e^y. After an inflow it is 1 + e^y; the points are even in y. A withdrawal
is paid where y > 0, and wealth after it is e^z with y = log(1 + e^z); the points are even in z. In these variables
what the next step integrates is never narrower than its own normal law, also near wealth 0 and at the edge of
depletion, so that the plain rule on steps h converges as exp(-pi^2 r^2), r = deviation/h.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers
from service.core.goals.points import Points, Spread
from service.core.goals.work import Work

REACH = 8.0
"""Beyond so many deviations the normal law holds less than 1e-15."""
MOST_BLOCKS = 16
ROWS = 512
"""Rows at a time: larger temporaries cost more than they save."""
TARGETS = 48
"""Targets at a time where both sides are uneven: neighbours share the points within reach."""
DIGITS = 13
"""Shifts that agree to so many decimals are one, and so share a block."""

Indices = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Block:
    """Weights of a stretch of rows: row k concerns the lattice places columns[k]."""

    start: int
    weights: Numbers
    columns: Indices

    def covers(self, start: int, stop: int) -> bool:
        """Whether rows start ... stop - 1 are among these."""
        return self.start <= start and stop <= self.start + len(self.weights)

    def rows(self, start: int, stop: int) -> tuple[Numbers, Indices]:
        """Give weights and columns of some rows."""
        part = slice(start - self.start, stop - self.start)
        return self.weights[part], self.columns[part]


@dataclass
class Quadrature:
    """The rule, with the blocks of weights that later steps use again, and the work done."""

    work: Work
    _blocks: dict[tuple[float, ...], Block] = field(default_factory=dict)

    def after_inflow(self, spread: Spread, log_unit: float, spacing: float) -> Points:
        """Give the points after an inflow of one unit: p'_j = h phi-mixture(h j)."""
        source, shift = spread.points, round(spread.shift - log_unit, DIGITS)
        start, stop = source.first, source.first + source.masses.size
        if stop == start:
            return Points(spacing, 0, np.zeros(0), 1.0)

        def make(first: int, last: int) -> Block:
            places = (source.log_wealth_from(first, last - first) + shift) / spacing
            return Block(first, *normal_band(places, spread.deviation / spacing))

        key = (0.0, source.rest, source.spacing, shift, spread.deviation, spacing)
        weights, columns = self._block(key, start, stop, spread.deviation / spacing, make).rows(start, stop)
        self.work.add(weights.size)
        first = int(columns[0, 0])  # places rise
        products = (weights * source.masses[:, np.newaxis]).ravel()
        masses: Numbers = np.asarray(np.bincount((columns - first).ravel(), products), np.float64)
        return Points(spacing, first, masses, 1.0)

    def after_outflow(self, spread: Spread, log_unit: float, spacing: float, lowest: float, rest: float) -> Points:
        """Give the points z >= lowest after a withdrawal of one unit, p'_j = h dy/dz f(y_j), f the mixture's density.

        `rest`: what comes in with it, once it is paid, in the same unit.
        """
        source, shift = spread.points, round(spread.shift - log_unit, DIGITS)
        start, stop = _paid_range(source.log_wealth() + shift, REACH * spread.deviation, spacing, lowest)
        if stop <= start:
            return Points(spacing, 0, np.zeros(0), rest)
        if source.rest > 0:
            return Points(spacing, start, self._uneven(source, shift, spread.deviation, spacing, start, stop), rest)

        def make(first: int, last: int) -> Block:
            z = spacing * np.arange(first, last)
            y = np.logaddexp(0.0, z)
            density, columns = normal_band((y - shift) / source.spacing, spread.deviation / source.spacing)
            density *= (spacing / source.spacing * np.exp(z - y))[:, np.newaxis]
            return Block(first, density, columns)

        key = (1.0, 0.0, source.spacing, shift, spread.deviation, spacing)
        weights, columns = self._block(key, start, stop, spread.deviation / source.spacing, make).rows(start, stop)
        self.work.add(weights.size)
        return Points(spacing, start, _gathered(weights, columns, source), rest)

    def _uneven(self, source: Points, shift: float, deviation: float, spacing: float, start: int, stop: int) -> Numbers:
        """Sum the density directly, where neither the points nor their targets are even in y."""
        self.work.block(stop - start, 2)
        z = spacing * np.arange(start, stop)
        y = np.logaddexp(0.0, z)
        centres, reach = source.log_wealth() + shift, REACH * deviation
        density: Numbers = np.empty(y.size)
        for at in range(0, y.size, TARGETS):
            here = y[at : at + TARGETS]
            low, high = np.searchsorted(centres, (here[0] - reach, here[-1] + reach))
            self.work.add(here.size * int(high - low))
            scores = (here[:, np.newaxis] - centres[low:high]) / deviation
            density[at : at + TARGETS] = np.exp(-scores * scores / 2) @ source.masses[low:high]
        density *= spacing / (deviation * np.sqrt(2 * np.pi)) * np.exp(z - y)
        return density

    def _block(
        self, key: tuple[float, ...], start: int, stop: int, deviation: float, make: Callable[[int, int], Block]
    ) -> Block:
        """Give a block that covers these rows: kept from a step before, or made with some room on either side.

        `deviation`: of the normal densities, in steps of the columns.
        """
        block = self._blocks.get(key)
        if block is None or not block.covers(start, stop):
            room = 8 + (stop - start) // 6
            if len(self._blocks) >= MOST_BLOCKS:
                self._blocks.clear()
            self.work.block(stop - start + 2 * room, 2 * int(REACH * deviation) + 2)
            block = self._blocks[key] = make(start - room, stop + room)
        return block


def normal_band(places: Numbers, deviation: float) -> tuple[Numbers, Indices]:
    """Normal density around each place (in lattice steps) on the lattice points within reach, and those points."""
    half = int(np.ceil(REACH * deviation))
    nearest = np.floor(places)
    steps = np.arange(-half, half + 2)
    scores = steps - (places - nearest)[:, np.newaxis]
    scores *= scores
    scores *= -0.5 / (deviation * deviation)
    np.exp(scores, out=scores)
    scores /= deviation * np.sqrt(2 * np.pi)
    return scores, nearest.astype(np.int64)[:, np.newaxis] + steps


def _paid_range(centres: Numbers, reach: float, spacing: float, lowest: float) -> tuple[int, int]:
    """Lattice range of z that the mixture reaches, from `lowest` on; y = log(1 + e^z)."""
    edge = float(np.logaddexp(0.0, lowest))
    if not centres.size or centres[-1] + reach <= edge:
        return 0, 0
    top, bottom = float(centres[-1]) + reach, float(centres[0]) - reach
    least = _above_unit(bottom) if bottom > edge else lowest
    return int(np.floor(least / spacing)), int(np.ceil(_above_unit(top) / spacing)) + 1


def _above_unit(y: float) -> float:
    """Give z with log(1 + e^z) = y > 0."""
    return y + float(np.log(-np.expm1(-y)))


def _gathered(weights: Numbers, columns: Indices, source: Points) -> Numbers:
    """Sum over columns of weights times the masses of the source there, 0 outside it."""
    low, high = int(columns[0, 0]), int(columns[-1, -1]) + 1
    masses = np.zeros(high - low)
    start, stop = max(source.first, low), min(source.first + source.masses.size, high)
    shared = max(stop - start, 0)
    masses[start - low :][:shared] = source.masses[start - source.first :][:shared]
    found = np.empty(len(weights))
    for at in range(0, len(weights), ROWS):
        rows = slice(at, at + ROWS)
        np.einsum("jk,jk->j", weights[rows], masses[columns[rows] - low], out=found[rows])
    return found
