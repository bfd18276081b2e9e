"""The recursion V <- max(V + flow, 0) G in probability: no sampling, no interpolation."""

from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.goals.course import RATIO, Course, Growth, certain_start
from service.core.goals.points import Points, Spread, single
from service.core.goals.quadrature import REACH, Quadrature
from service.core.goals.wealth import NOTHING, ListedWealth, MixedWealth, Payment

LEAST_LOG = -45.0
"""Nothing that matters lies below so small a share (e^-45) of a withdrawal: the law's density falls with the share."""
BEFORE_INFLOW = -30.0
"""The same where money comes in next."""
SHOWN = -10.0
"""Wealth below this share of the withdrawal just paid is shown as 0 on the way."""
SHOWN_AT_END = -16.0
"""The same at the horizon, where gaps are asked for."""
GONE = 1e-17
"""A probability of anything left that is taken as 0."""


@dataclass
class _State:
    """Where the recursion stands: points after the flow at date `since`; what was paid since, growth being certain.

    `held` is the law of wealth just before those payments, `alive_held` and `mean_held` the probability of not being
    depleted and E[V] then, `alive` and `mean` those now. `doomed` is the part of E[V] that the points leave out, since
    it cannot survive the next withdrawal.
    """

    points: Points
    shift: float
    since: int
    mean: float
    alive: float = 1.0
    doomed: float = 0.0
    held: Spread | None = None
    payment: Payment = NOTHING
    alive_held: float = 1.0
    mean_held: float = 0.0


@dataclass(frozen=True)
class Recursion:
    """One run: `reported` are the dates whose law of wealth is wanted, `least_target` the least one above 0 asked for.

    `averages`: whether E[V] is wanted, by E[V'] = (E[V] + c P(alive) + E[max(|c| - V, 0); alive]) E[G], which needs
    nothing of the far tail. `ratio`: points in one deviation.
    """

    flows: Numbers
    growth: Growth
    reported: frozenset[int]
    quadrature: Quadrature
    least_target: float | None = None
    averages: bool = True
    ratio: float = RATIO

    @property
    def last(self) -> int:
        """The horizon's date."""
        return self.flows.size - 1

    def run(self, initial_value: float) -> Course:
        """Follow the plan from date 0 to the horizon. Raises DoesNotFit for too much work."""
        course = Course.over(self.flows.size)
        course.method, course.error_share = self.growth.method, self.growth.error_share
        course.error_floor = self.growth.error_floor
        start, value = certain_start(course, self.flows, self.growth, initial_value, self.reported)
        if start == self.last:
            return course
        points, shift = single(value)
        state = _State(points, shift, start, value)
        busy = self._busy_dates(start)
        for date in range(start + 1, self.flows.size):
            self._grow(state, date, course)
            if busy[date] and state.alive > GONE:
                self._visit(state, date, course)
            if state.alive <= GONE:
                self._nothing_from(date, course)
                break
            if date < self.last and state.held is not None and self.growth.random[date]:
                self._settle(state, date, course, int(date + 1 + np.argmax(busy[date + 1 :])))
        return course

    def _busy_dates(self, start: int) -> Numbers:
        """Mark the dates after the start with a flow or a report, and the last."""
        busy = np.array(self.flows != 0)
        busy[[*self.reported, self.last]] = True
        busy[: start + 1] = False
        return busy

    def _grow(self, state: _State, date: int, course: Course) -> None:
        """Let wealth grow until the date."""
        survival, factor = float(self.growth.survival[date - 1]), float(np.exp(self.growth.log_factors[date - 1]))
        course.lost[date] = state.alive * (1 - survival)
        state.alive *= survival
        state.mean *= factor
        state.doomed *= factor if state.doomed > 0 else 1.0
        course.expected[date] = state.mean + state.doomed
        if state.held is not None:
            state.payment = state.payment.grown(float(self.growth.certain[date - 1]))

    def _visit(self, state: _State, date: int, course: Course) -> None:
        """Report the law of wealth at a date, and pay its flow."""
        self.quadrature.work.step()
        held = state.held
        if held is None:
            held = self.growth.spread(state.points, state.shift, state.since, date)
            state.alive_held, state.mean_held = state.alive, state.mean
        before = state.payment
        flow = float(self.flows[date])
        if flow != 0:
            state.held, state.payment = held, before.then(flow)
            self._pay(state, held, date, course)
        if date == self.last:
            before = state.payment
            course.expected[date] = state.mean + state.doomed
        if date in self.reported:
            course.wealth[date] = MixedWealth.of(held, state.alive_held, before)

    def _pay(self, state: _State, held: Spread, date: int, course: Course) -> None:
        """Find who can pay, and E[V] after: e^m (E[W] - t P + E[max(t - W, 0)] + (t + amount) P(W >= t)).

        W before the payment, t its threshold, P the mass of the points.
        """
        payment = state.payment
        if payment.threshold > 0:
            alive = min(held.probability_at_least(payment.threshold), state.alive)
            course.unpaid[date] = state.alive - alive
            if self.growth.discrete:
                course.roughness += MixedWealth.of(held, state.alive, payment).roughness(0.0)
            state.alive, state.doomed = alive, 0.0
        if self.averages:
            mean = state.mean_held + payment.amount * state.alive
            if payment.threshold > 0:
                points = float(held.points.masses.sum())
                unmet = held.shortfall(payment.threshold)
                mean += unmet - payment.threshold * (points - state.alive)
            state.mean = max(mean, 0.0) * float(np.exp(payment.log_growth))

    def _nothing_from(self, date: int, course: Course) -> None:
        """Report that nothing is left."""
        course.expected[date + 1 :] = 0.0
        for later in self.reported:
            if later > date or later not in course.wealth:
                course.wealth[later] = ListedWealth(np.zeros(0), np.zeros(0))

    def _settle(self, state: _State, date: int, course: Course, until: int) -> None:
        """Turn what was held and paid into points, before growth goes on from `date` until the next busy date."""
        held, payment = state.held, state.payment
        assert held is not None  # noqa: S101 - the caller looked
        state.held, state.payment = None, NOTHING
        if payment.threshold <= 0 and payment.amount <= 0:
            return  # what came in went out again while nothing was at risk
        spacing = self.growth.spacing(held, date, until, self.ratio)
        if payment.threshold <= 0:
            log_unit = float(np.log(payment.amount))
            points = self.quadrature.after_inflow(held, log_unit, spacing)
            full = True
        else:
            log_unit = float(np.log(payment.threshold))
            rest = payment.amount / payment.threshold + 1
            rest = rest if rest > 1e-12 else 0.0
            lowest = self._lowest(log_unit + payment.log_growth, date, rest)
            computed = min(lowest, SHOWN) if self.averages else lowest
            points = self.quadrature.after_outflow(held, log_unit, spacing, computed, rest)
            full = lowest <= BEFORE_INFLOW
        if full:
            course.defect = max(course.defect, abs(float(points.masses.sum()) - state.alive))
        state.shift, state.since = log_unit + payment.log_growth, date
        if payment.threshold > 0 and self.averages:
            points = self._set_aside(state, points, lowest)
        state.points = self.growth.trimmed(points)

    def _set_aside(self, state: _State, points: Points, lowest: float) -> Points:
        """Leave out the points below `lowest`, and keep their part of E[V] aside."""
        left_out = min(max(int(np.floor(lowest / points.spacing)) - points.first, 0), points.masses.size)
        low = Points(points.spacing, points.first, points.masses[:left_out])
        state.doomed = float(low.masses @ np.exp(low.log_wealth() + state.shift))
        state.mean -= state.doomed
        return Points(points.spacing, points.first + left_out, points.masses[left_out:], points.rest)

    def _lowest(self, shift: float, date: int, rest: float) -> float:
        """Least z that matters after a withdrawal, wealth being e^(z + shift)."""
        if rest > 0:
            return LEAST_LOG
        flows = np.flatnonzero(self.flows[date + 1 :])
        following = date + 1 + int(flows[0]) if flows.size else self.last
        flow = float(self.flows[following])
        if flow > 0:
            return BEFORE_INFLOW
        shown = any(date < other <= following for other in self.reported)
        bounds = [SHOWN_AT_END if following == self.last else SHOWN] if shown else []
        needed = [-flow] if flow < 0 else []
        needed += [self.least_target] if shown and self.least_target else []
        if needed:
            reach = REACH * self.growth.deviation(date, following)
            drift = float(self.growth.drift(date, following))
            bounds.append(float(np.log(min(needed))) - shift - drift - reach)
        return max(min(bounds), LEAST_LOG)
