"""Stochastic dominance: which portfolio no one who prefers more, or shuns risk, would choose before another."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from service.core.arrays import NO_VALUE, Numbers, Truths
from service.core.portfolio.question import Dominated
from service.core.returns.law import Atoms, HorizonLaw
from service.core.returns.laws.collected import CollectedLaw, Positions, stacked

EXACT = "exact"
NUMERICAL = "numerical"
FIRST, SECOND = 1, 2
CLOSE = 1e-14
"""Parameters this close, relative to 1 or their size, are equal: they differ by conversion alone."""
NOTICEABLE = 1e-12
"""A difference of figures below this may be their error."""
LEAST_PROBABILITY = 1e-6
GRID_POINTS = 121
MOST_VALUES = 5_000
"""Laws with more values are compared on the grid."""
UNRELATED = -1

Orders = npt.NDArray[np.int64]
"""Dominance of one portfolio over each other: 1, 2, or 0 for none."""


def dominated(law: CollectedLaw, order: Positions) -> tuple[Dominated, ...]:
    """Give each dominated portfolio once: by the best-ranked one that dominates it, at the lowest order that holds.

    First order: F_A <= F_B everywhere and < somewhere. Second: the same of their integrals, both means finite. Exact
    within a kind of law by its parameters (Levy 1973) and between laws of atoms by cumulative sums; else numerical: on
    121 probabilities from 1e-6 to 1 - 1e-6. Work: the number of portfolios for each of them;
    within a kind, for those that nobody dominates.
    """
    comparison = Comparison(law)
    open_ = np.full(law.count, True)
    found: list[Dominated] = []
    for a in order:
        if comparison.grid is None and not open_[a]:
            continue  # within a kind, what it dominates its own dominator dominates too
        others = np.flatnonzero(open_ & (np.arange(law.count) != a))
        orders, exact = comparison.orders(int(a), others)
        for b, degree, is_exact in zip(others, orders, exact, strict=True):
            if degree:
                found.append(Dominated(int(b), int(a), int(degree), EXACT if is_exact else NUMERICAL))
                open_[b] = False
    return tuple(sorted(found, key=lambda one: one.index))


@dataclass(frozen=True)
class _Grid:
    """Quantiles and mean losses at the probabilities of the numerical test: portfolios by probabilities."""

    quantiles: Numbers
    mean_losses: Numbers


class Comparison:
    """Everything that decides dominance between the portfolios of one law."""

    def __init__(self, law: CollectedLaw) -> None:
        self.means = law.mean()
        self.kinds = np.full(law.count, UNRELATED)
        self.parameters = np.full((4, law.count), NO_VALUE)
        self.atoms: list[Atoms | None] = [None] * law.count
        self.jumps = np.full(law.count, False)
        self.listed = np.full(law.count, False)
        names: dict[str, int] = {}
        for part, positions in law.parts:
            ordering = part.ordering()
            if ordering is None:
                self._set_atoms(part, positions)
                continue
            self.kinds[positions] = names.setdefault(ordering.kind, len(names))
            self.parameters[:, positions] = stacked(ordering[1:])
        alike = (self.kinds == self.kinds[0]) & (self.parameters[0] == self.parameters[0][0])
        self.grid = None if alike.all() and self.kinds[0] != UNRELATED else _grid(law)

    def _set_atoms(self, part: HorizonLaw, positions: Positions) -> None:
        """Keep the values of a discrete law where they are few enough to compare."""
        self.jumps[positions] = part.discrete
        atoms = part.atoms()
        if atoms is None or atoms.values.size > MOST_VALUES:
            return
        self.listed[positions] = True
        for position in positions:
            self.atoms[int(position)] = atoms

    def orders(self, a: int, others: Positions) -> tuple[Orders, Truths]:
        """Give the order of a's dominance over each of the others, and whether it is exact."""
        shape, location, scale, level = self.parameters
        same = (self.kinds[others] != UNRELATED) & (self.kinds[others] == self.kinds[a]) & (shape[others] == shape[a])
        orders = np.where(same, _by_parameters(location, scale, level, a, others), 0)
        if self.grid is None:
            return orders, same
        jumps = (self.jumps[others] | self.jumps[a]) & ~(self.listed[others] & self.listed[a])
        numerical = np.where(same, 0, _on_grid(self.grid, self.means, a, others, jumps))
        atoms, both_atoms = self.atoms[a], np.full(others.size, False)
        for i, other in enumerate(self.atoms[b] for b in others):
            if atoms is not None and other is not None:
                both_atoms[i] = True
                numerical[i] = _by_atoms(atoms, other) if numerical[i] else 0
        return np.where(same, orders, numerical), same | both_atoms


def _by_parameters(location: Numbers, scale: Numbers, level: Numbers, a: int, others: Positions) -> Orders:
    """Compare laws of one kind and shape; a level of nan never holds."""
    same_scale, less_scale = _compared(scale[others], scale[a])
    same_level, more_level = _compared(level[a], level[others])
    first = same_scale & _compared(location[a], location[others])[1]
    second = (same_scale | less_scale) & (same_level | more_level) & (less_scale | more_level)
    return np.where(first, FIRST, np.where(second, SECOND, 0))


def _compared(x: Numbers, y: Numbers) -> tuple[Truths, Truths]:
    """Whether x equals y within rounding, and whether it is greater beyond that."""
    margin = CLOSE * np.maximum(np.abs(x), np.abs(y))
    return np.abs(x - y) <= margin, x - y > margin


def _grid(law: CollectedLaw) -> _Grid:
    """Probabilities evenly spaced on the logistic scale."""
    reach = np.log(LEAST_PROBABILITY) - np.log1p(-LEAST_PROBABILITY)
    probabilities = (1 / (1 + np.exp(-np.linspace(reach, -reach, GRID_POINTS))))[:, np.newaxis]
    return _Grid(law.quantile(probabilities).T.copy(), law.expected_shortfall(probabilities).T.copy())


def _on_grid(grid: _Grid, means: Numbers, a: int, others: Positions, jumps: Truths) -> Orders:
    """Second order by the mean of the worst outcomes, which is the integral of the quantile function.

    Where one of the two laws `jumps`, and they are not compared value by value, first order must hold from each
    probability to the next, so that no jump between them goes unseen.
    """
    quantiles = grid.quantiles[others]
    smooth = _above(grid.quantiles[a], quantiles)
    first = np.where(jumps, _above(grid.quantiles[a][:-1], quantiles[:, 1:]), smooth)
    second = _above(-grid.mean_losses[a], -grid.mean_losses[others])
    second &= np.isfinite(means[a]) & np.isfinite(means[others]) & (means[a] >= means[others] - NOTICEABLE)
    return np.where(first, FIRST, np.where(second, SECOND, 0))


def _above(one: Numbers, others: Numbers) -> Truths:
    """Whether `one` is nowhere noticeably below, and somewhere noticeably above, each row of `others`."""
    difference = one - others
    noticeable = NOTICEABLE * (1 + np.abs(one))
    return np.asarray((difference >= -noticeable).all(axis=1) & (difference > noticeable).any(axis=1))


def _by_atoms(a: Atoms, b: Atoms) -> int:
    """Compare two laws of atoms on the pieces on which both quantile functions are constant."""
    ends = np.union1d(a.cumulative, b.cumulative)
    widths = np.diff(ends, prepend=0.0)
    pieces = widths > NOTICEABLE
    middles = (ends - widths / 2)[pieces]
    high, low = (law.values[np.searchsorted(law.cumulative, middles)] for law in (a, b))
    margin = CLOSE * (1 + np.abs(high))
    if (high >= low - margin).all() and (high > low + margin).any():
        return FIRST
    lead = np.cumsum(widths[pieces] * (high - low))
    margin = CLOSE * (1 + np.abs(high).max() + np.abs(low).max())
    return SECOND if (lead >= -margin).all() and (lead > margin).any() else 0
