"""The law of wealth at one date: what an outlook reads from it."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import ndtr, ndtri

from service.core.arrays import Numbers
from service.core.goals.points import Spread, at_least, shortfall

PAID = 1e-9
"""A withdrawal is paid in full if at most this share of it is missing."""
NEAR = 7.5
"""Nodes farther than so many deviations count as wholly below or above."""
UNNOTICED = 1e-11
"""A quantile this close to the probability of nothing being left is 0."""
COINCIDENCE = 1e-12
"""Cumulative probabilities of single outcomes this close to a level are equal to it."""
ROUNDS = 60
ROUND = 64
"""Points on either side of a level that are looked at for single outcomes."""
TOGETHER = 16
"""Quantiles searched at a time."""
LARGEST_LOG = 709.0
"""exp of more leaves the doubles."""


@dataclass(frozen=True, slots=True)
class Payment:
    """What is paid in and out while growth is certain: wealth W becomes (W + amount) e^log_growth if W >= threshold.

    Below the threshold (0: it cannot happen) some withdrawal is not paid in full and the plan is depleted. `owed` is
    that withdrawal.
    """

    threshold: float = 0.0
    amount: float = 0.0
    log_growth: float = 0.0

    def then(self, flow: float) -> "Payment":
        """Add a flow, after the certain growth so far."""
        amount = self.amount + flow * float(np.exp(-self.log_growth))
        threshold = max(self.threshold, -amount) if flow < 0 else self.threshold
        return Payment(threshold, amount, self.log_growth)

    def grown(self, log_growth: float) -> "Payment":
        """Let what is there grow."""
        return Payment(self.threshold, self.amount, self.log_growth + log_growth)

    def before(self, wealth: float) -> float:
        """Give what there must have been before, for so much after; may be below zero."""
        return wealth * float(np.exp(-self.log_growth)) - self.amount

    def after(self, wealth: Numbers) -> Numbers:
        """Give what there is after, 0 where something could not be paid."""
        paid = wealth >= self.threshold
        return np.where(paid, np.maximum(wealth + self.amount, 0.0) * np.exp(self.log_growth), 0.0)


NOTHING = Payment()


class Wealth:
    """The law of wealth V at a date; V = 0 with what is depleted."""

    def solvent_at_least(self, level: float) -> float:
        """P(not depleted and V >= level)."""
        raise NotImplementedError

    def gap(self, level: float) -> float:
        """E[max(level - V, 0)]."""
        raise NotImplementedError

    def quantiles(self, probabilities: Numbers) -> Numbers:
        """Give the lower quantiles of V."""
        raise NotImplementedError

    def greatest_reached(self, probability: float) -> float:
        """Give the greatest level with P(not depleted and V >= level) >= probability."""
        return float(self.quantiles(np.array([1 - probability]))[0])

    def paying(self, flow: float) -> "Wealth":
        """Give the law of wealth after one more flow."""
        raise NotImplementedError

    def roughness(self, level: float) -> float:  # noqa: ARG002 - what is listed is not smeared
        """Probability near V = level that may have been put on its wrong side."""
        return 0.0


@dataclass(frozen=True)
class ListedWealth(Wealth):
    """Every value V can take, not depleted, with its probability."""

    values: Numbers
    masses: Numbers

    def solvent_at_least(self, level: float) -> float:
        """P(not depleted and V >= level)."""
        reached = self.values >= level - COINCIDENCE * abs(level)
        return float(self.masses[reached].sum())

    def gap(self, level: float) -> float:
        """E[max(level - V, 0)]."""
        depleted = 1 - float(self.masses.sum())
        return float(self.masses @ np.maximum(level - self.values, 0.0)) + level * max(depleted, 0.0)

    def quantiles(self, probabilities: Numbers) -> Numbers:
        """Give the lower quantiles of V."""
        order = np.argsort(self.values, kind="stable")
        values = np.concatenate([[0.0], self.values[order]])
        cumulative = 1 - np.append(np.cumsum(self.masses[order][::-1])[::-1], 0.0)
        return values[np.minimum(np.searchsorted(cumulative, probabilities - COINCIDENCE), values.size - 1)]

    def greatest_reached(self, probability: float) -> float:
        """Give the greatest value that is reached so often, 0 if none is."""
        order = np.argsort(-self.values, kind="stable")
        enough = np.cumsum(self.masses[order]) >= probability - COINCIDENCE
        return float(self.values[order][np.argmax(enough)]) if enough.any() else 0.0

    def paying(self, flow: float) -> "ListedWealth":
        """Give the law of wealth after one more flow."""
        after = self.values + flow
        paid = (after >= PAID * flow) | (flow >= 0)
        return ListedWealth(np.maximum(after[paid], 0.0), self.masses[paid])


@dataclass(frozen=True)
class MixedWealth(Wealth):
    """Lognormal laws around `centres` (rising logarithms) with these masses, and what was paid since.

    `alive`: P(not depleted) before the payment. It may exceed the sum of the masses, where hardly anything is left.
    """

    centres: Numbers
    masses: Numbers
    deviation: float
    alive: float
    payment: Payment = NOTHING

    @classmethod
    def of(cls, spread: Spread, alive: float, payment: Payment) -> "MixedWealth":
        """Read the law off a mixture."""
        return cls(spread.log_centres(), spread.points.masses, spread.deviation, alive, payment)

    @classmethod
    def blend(cls, shares: Sequence[float], laws: Sequence["MixedWealth"]) -> "MixedWealth":
        """Mix laws of one deviation and one payment."""
        centres = np.concatenate([law.centres for law in laws])
        masses = np.concatenate([share * law.masses for share, law in zip(shares, laws, strict=True)])
        alive = sum(share * law.alive for share, law in zip(shares, laws, strict=True))
        order = np.argsort(centres, kind="stable")
        return cls(centres[order], masses[order], laws[0].deviation, alive, laws[0].payment)

    def solvent_at_least(self, level: float) -> float:
        """P(not depleted and V >= level)."""
        needed = max(self.payment.before(level), self.payment.threshold)
        if needed <= 0:
            return self.alive
        return min(max(at_least(self.centres, self.masses, self.deviation, needed), 0.0), self.alive)

    def gap(self, level: float) -> float:
        """E[max(level - V, 0)]."""
        threshold, needed = self.payment.threshold, self.payment.before(level)
        below = level * (1 - self.solvent_at_least(0.0))
        if needed <= threshold:
            return below
        gap = shortfall(self.centres, self.masses, self.deviation, needed) + needed * self._missing
        if threshold > 0:
            unpaid = float(self.masses.sum()) - at_least(self.centres, self.masses, self.deviation, threshold)
            gap -= shortfall(self.centres, self.masses, self.deviation, threshold) + (needed - threshold) * unpaid
            gap -= needed * self._missing
        return gap * float(np.exp(self.payment.log_growth)) + below

    def paying(self, flow: float) -> "MixedWealth":
        """Give the law of wealth after one more flow."""
        return replace(self, payment=self.payment.then(flow))

    def roughness(self, level: float) -> float:
        """Probability near V = level that may be on its wrong side: the largest jump in the slope of the masses there.

        Masses of a smooth law hardly bend from one point to the next; single outcomes, each smeared over a few points,
        do. Five times the jump was never below the error of random plans, whatever their runs agree upon by chance.
        """
        needed = max(self.payment.before(level), self.payment.threshold)
        if needed <= 0:
            return 0.0
        at = int(np.searchsorted(self.centres, np.log(needed)))
        near = self.masses[max(at - ROUND, 0) : at + ROUND]
        return 5 * float(np.abs(np.diff(near, 2)).max(initial=0.0))

    @property
    def _missing(self) -> float:
        """Mass that is alive with next to nothing."""
        return max(self.alive - float(self.masses.sum()), 0.0)

    def quantiles(self, probabilities: Numbers) -> Numbers:
        """Give the lower quantiles of V."""
        total = float(self.masses.sum())
        beyond_nothing = probabilities - (1 - total)
        before = np.zeros(probabilities.size)
        cumulative = np.concatenate([[0.0], np.cumsum(self.masses)])
        some = np.flatnonzero(beyond_nothing > UNNOTICED)
        for at in range(0, some.size, TOGETHER):
            part = some[at : at + TOGETHER]
            before[part] = self._quantiles(beyond_nothing[part], cumulative)
        # what is depleted gets nothing of what still comes in
        return np.where(probabilities > 1 - self.alive + UNNOTICED, self.payment.after(before), 0.0)

    def _quantiles(self, mass: Numbers, cumulative: Numbers) -> Numbers:
        """exp(y) with so much mass below: Newton on the mixture's distribution function, bracketed."""
        centres, s = self.centres, self.deviation
        y = np.interp(mass, (cumulative[1:] + cumulative[:-1]) / 2, centres)
        if centres.size == 1:
            y = y + s * ndtri(np.minimum(mass / cumulative[-1], 1.0))
        low, high = np.full(y.size, centres[0] - 40 * s), np.full(y.size, centres[-1] + 40 * s)
        found = np.zeros(y.size, np.bool_)
        rounds = 0
        while rounds < ROUNDS and not found.all():
            rounds += 1
            below, density = self._near(y, cumulative)
            over = below > mass
            low, high = np.where(over, low, y), np.where(over, y, high)
            newton = y - (below - mass) / np.maximum(density, 1e-200)
            new = np.where((newton >= low) & (newton <= high), newton, (low + high) / 2)
            moved = np.where(found, 0.0, new - y)
            y = y + moved
            found = np.abs(moved) < 1e-11
        return np.exp(np.minimum(y, LARGEST_LOG))

    def _near(self, y: Numbers, cumulative: Numbers) -> tuple[Numbers, Numbers]:
        """Mass below each y, and its density there, from the centres near it; those far below count whole."""
        s = self.deviation
        left, right = np.searchsorted(self.centres, [y - NEAR * s, y + NEAR * s])
        index = left[:, np.newaxis] + np.arange(max(int((right - left).max()), 1))
        masses = np.where(index < right[:, np.newaxis], self.masses.take(index, mode="clip"), 0.0)
        d = (y[:, np.newaxis] - self.centres.take(index, mode="clip")) / s
        below = cumulative[left] + np.vecdot(masses, ndtr(d))
        return below, np.vecdot(masses, np.exp(-d * d / 2)) / (s * np.sqrt(2 * np.pi))
