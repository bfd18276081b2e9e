"""The efficient frontier as a path: mixes w(lam) that are piecewise linear in the appetite for return lam.

w(lam) = argmin w'Aw/2 - lam mu'w over sum w = 1, least <= w <= most, with A = covariance + ridge (Markowitz 1956). The
ridge, 1e-9 of the largest variance, makes the mix unique and stable: of equal optima the limit of a vanishing ridge.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers, Truths

RIDGE = 1e-9
MOST_TURNS = 2_000
TURNS_FOR_EACH = 200
PATIENCE = 40
STEP = 1e-15
"""A weight this far beyond its limit is at it."""


@dataclass(frozen=True, slots=True)
class Piece:
    """A stretch of the frontier: w(lam) = constant + lam slope for lowest <= lam <= highest."""

    lowest: float
    highest: float
    constant: Numbers
    slope: Numbers

    def weights(self, lam: float) -> Numbers:
        """Give the mix at lam."""
        return self.constant + lam * self.slope


@dataclass(frozen=True, slots=True)
class Free:
    """The mix when only the free weights move: their positions, their line in lam, the multiplier's line in lam."""

    at: npt.NDArray[np.intp]
    constant: Numbers
    slope: Numbers
    multiplier: float
    multiplier_slope: float


class Frontier:
    """Finds pieces of the frontier by a primal active-set method, each search warm from the mix before."""

    def __init__(self, means: Numbers, covariance: Numbers, least: Numbers, most: Numbers) -> None:
        self.means, self.covariance, self.least, self.most = means, covariance, least, most
        self.scale = max(float(np.diag(covariance).max()), 1e-300)
        self.ridge = RIDGE * self.scale
        self.risk = covariance + self.ridge * np.eye(means.size)
        self.weights = filled(least, most, np.diag(covariance))
        self.free: Truths = (self.weights > least) & (self.weights < most)
        if not self.free.any():
            largest = int(np.argmax(self.weights))
            self.free[largest] = most[largest] > least[largest]

    def solve(self, lam: float) -> Piece:
        """Move to the mix at lam >= 0 and give the piece that it lies on. Raises RuntimeError if it does not settle."""
        tolerance = 1e-15 * (self.scale + abs(lam) * float(np.abs(self.means).max()))
        count = self.means.size
        for turn in range(1, TURNS_FOR_EACH * count + MOST_TURNS):
            if turn % (6 * count + PATIENCE) == 0:
                tolerance *= 30  # ties in the last digit must not turn for ever
            if not self.free.any() and not self._free_a_pair(lam, tolerance):
                return self._corner(lam)
            line = self._line()
            if self._blocked(line, lam):
                continue
            if not self._admit(line, lam, tolerance):
                return self._piece(line, lam)
        raise RuntimeError("the active set did not settle")

    def _line(self, centre: Numbers | None = None) -> Free:
        """Solve for the free weights: A w - lam mu + eta = 0 on them, sum w = 1; `centre` moves the ridge's centre."""
        at, bound = np.flatnonzero(self.free), np.flatnonzero(~self.free)
        k = at.size
        left = 1 - self.weights[bound].sum()
        bordered = np.zeros((k + 1, k + 1))
        bordered[:k, :k] = self.risk[np.ix_(at, at)]
        bordered[:k, k] = bordered[k, :k] = self.scale  # a border of the size of the rest keeps it well balanced
        right = np.zeros((k + 1, 2))
        right[:k, 0] = -self.risk[np.ix_(at, bound)] @ self.weights[bound]
        if centre is not None:
            right[:k, 0] += self.ridge * centre[at]
        right[:k, 1] = self.means[at]
        right[k, 0] = left * self.scale
        solved = np.asarray(np.linalg.solve(bordered, right), np.float64)
        solved += np.linalg.solve(bordered, right - bordered @ solved)  # one refinement
        constant, slope = solved[:k, 0], solved[:k, 1]
        if k == 1:  # one free weight is what the others leave
            constant, slope = np.array([left]), np.zeros(1)
        noise = 1e-13 * float(np.abs(self.means).max()) / self.scale
        slope = np.where(np.abs(slope) < noise, 0.0, slope)
        return Free(at, constant, slope, float(solved[k, 0]) * self.scale, float(solved[k, 1]) * self.scale)

    def recentred(self) -> Piece | None:
        """Give the line of the present free weights with the ridge centred at the present mix; None: none is free."""
        if not self.free.any():
            return None
        return self._along(self._line(self.weights))

    def _along(self, line: Free, lowest: float = 0.0, highest: float = np.inf) -> Piece:
        constant, slope = self.weights.copy(), np.zeros(self.means.size)
        constant[line.at], slope[line.at] = line.constant, line.slope
        return Piece(lowest, highest, constant, slope)

    def _blocked(self, line: Free, lam: float) -> bool:
        """Go along the line as far as the limits allow; whoever reaches one first is bound there."""
        at = line.at
        target = line.constant + lam * line.slope
        low, high = self.least[at], self.most[at]
        below, above = target < low - STEP, target > high + STEP
        if not (below | above).any():
            self.weights[at] = np.clip(target, low, high)
            return False
        step = target - self.weights[at]
        with np.errstate(all="ignore"):
            limit = np.where(below, low, high)
            reach = np.where(below | above, (limit - self.weights[at]) / step, np.inf)
        far = max(0.0, float(reach.min()))
        self.weights[at] = np.clip(self.weights[at] + far * step, low, high)
        hit = reach <= far * (1 + 1e-12)
        self.weights[at[hit]] = limit[hit]
        self.free[at[hit]] = False
        return True

    def _admit(self, line: Free, lam: float, tolerance: float) -> bool:
        """Free the bound weight whose gradient is most wrong for where it is bound, if any is."""
        bound = np.flatnonzero(~self.free)
        if not bound.size:
            return False
        gradient = self.risk[bound] @ self.weights - lam * self.means[bound]
        gradient = gradient + line.multiplier + lam * line.multiplier_slope
        wrong = np.where(self.weights[bound] <= self.least[bound], -gradient, gradient)
        wrong = np.where(self.most[bound] <= self.least[bound], 0.0, wrong)
        worst = int(np.argmax(wrong))
        if wrong[worst] <= tolerance:
            return False
        self.free[bound[worst]] = True
        return True

    def _free_a_pair(self, lam: float, tolerance: float) -> bool:
        """With every weight bound: free the two between which moving weight gains most, if any gain is left."""
        gradient = self.risk @ self.weights - lam * self.means
        up, down = np.flatnonzero(self.weights < self.most), np.flatnonzero(self.weights > self.least)
        if not up.size or not down.size:
            return False
        giver, taker = down[np.argmax(gradient[down])], up[np.argmin(gradient[up])]
        if giver == taker or gradient[taker] >= gradient[giver] - tolerance:
            return False
        self.free[[giver, taker]] = True
        return True

    def _piece(self, line: Free, lam: float) -> Piece:
        """Give the stretch of lam on which no free weight meets a limit and no bound one wants to leave it."""
        along = self._along(line)
        flat = 1e-15 * (float(np.abs(line.slope).max()) + 1e-300)
        ends = [
            _crossings(line.constant - self.least[line.at], line.slope, flat),
            _crossings(self.most[line.at] - line.constant, -line.slope, flat),
        ]
        bound = np.flatnonzero(~self.free & (self.most > self.least))
        if bound.size:
            sign = np.where(self.weights[bound] <= self.least[bound], 1.0, -1.0)
            start = self.risk[bound] @ along.constant + line.multiplier
            rise = self.risk[bound] @ along.slope - self.means[bound] + line.multiplier_slope
            ends.append(_crossings(sign * start, sign * rise, 1e-14 * float(np.abs(self.means).max())))
        lowest = max(0.0, *(low for low, _ in ends))
        return self._along(line, min(lowest, lam), max(min(high for _, high in ends), lam))

    def _corner(self, lam: float) -> Piece:
        """Give the stretch of lam on which a mix with every weight bound stays best."""
        gradient = self.risk @ self.weights
        up, down = self.weights < self.most, self.weights > self.least
        lowest, highest = 0.0, np.inf
        if up.any() and down.any():
            apart = gradient[up][:, None] - gradient[down]
            pull = self.means[down] - self.means[up][:, None]
            with np.errstate(all="ignore"):
                turn = -apart / pull
            lowest = float(turn[(pull > 0) & (turn <= lam * (1 + 1e-12))].max(initial=0.0))
            highest = float(turn[(pull < 0) & (turn >= lam * (1 - 1e-12))].min(initial=np.inf))
        return Piece(min(lowest, lam), max(highest, lam), self.weights.copy(), np.zeros(self.means.size))


def _crossings(start: Numbers, rise: Numbers, flat: float) -> tuple[float, float]:
    """Give the lam between which every start + lam rise is 0 or more; slopes up to `flat` count as none."""
    with np.errstate(all="ignore"):
        crossing = -start / rise
    lowest = float(crossing[rise > flat].max(initial=-np.inf))
    return lowest, float(crossing[rise < -flat].min(initial=np.inf))


def filled(least: Numbers, most: Numbers, order: Numbers) -> Numbers:
    """Give the mix that takes as much as it may of each asset, by rising `order`."""
    weights = least.copy()
    left = 1 - weights.sum()
    for index in np.argsort(order, kind="stable"):
        more = min(most[index] - least[index], left)
        weights[index] += more
        left -= more
        if left <= 0:
            break
    return weights
