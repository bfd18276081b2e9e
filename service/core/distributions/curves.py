"""Points of a curve, placed where it bends, so that straight lines between them are true to it."""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np

from service.core.arrays import INFINITY, Numbers, number
from service.core.distributions.events import Event
from service.core.distributions.family import Family
from service.core.distributions.quantiles import quantile

CURVES = ("density", "cumulative", "exceedance", "quantile")
CUT = 5e-4
"""Probability left out at an end of the curve that has no end of its own."""
POLE_CUT = 0.01
"""The same where the density grows without bound, so that the rest of the curve keeps a height to be seen by."""
NEAR = 0.5
"""An end of the support this close, in widths of the curve, is drawn."""
FINE = 1_024
"""Trial points that are evenly spaced."""
BY_TAIL = 320
"""Trial points on either side that are evenly spaced in the logarithm of the tail."""
DEEPEST = 1e-30
"""Near an end of the support a curve may start steeply: trial points lie as deep as this in the tail."""
ROUNDS = 8
"""So often trial intervals that bend too much are halved."""
MOST_VALUES = 16_384
"""Of so many values of a discrete law those that are drawn are chosen."""
LEAST_SHARE = 0.1
"""Share of the bending that is spread evenly along the curve, so that flat stretches get points too."""
TAILS: Numbers = np.exp(np.linspace(np.log(DEEPEST), np.log(0.5), BY_TAIL))


class Curve(NamedTuple):
    """Points of a curve. `discrete`: masses or steps at single values, not to be joined by slopes.

    Two points of one x are a jump. A density that is infinite at an end of the support has inf there.
    """

    x: Numbers
    y: Numbers
    discrete: bool


def curve(law: Family, kind: str, points: int, shade: Event | None = None) -> Curve:
    """Give at most `points` points (10 or more) of a curve of one law (its parameters are single numbers).

    Trial points lie evenly in x and in the logarithm of either tail; of them those are kept that share the bending,
    the integral of the square root of |second difference|, equally: then the error of straight lines is the same
    between any two, (bending/points)^2/8 (de Boor 1973, A Practical Guide to Splines, ch. III, from memory). Kinks,
    jumps, poles and the bounds of `shade` are points themselves.
    """
    with np.errstate(all="ignore"):
        if kind == "quantile":
            return _quantile_curve(law, points)
        low, high = window(law, kind)
        marks = _marks(law, low, high, shade)
        if law.discrete:
            return _discrete_curve(law, kind, low, high, points)
        poles, jumps = _ends(law, kind, low, high)
        trial = _trial(law, *_inside(law, low, high, poles), marks)
        most = points - len(poles) - len(jumps)
        kept = thinned(*refined(trial, lambda x: _height(law, kind, x), most), marks, most)
        return _joined(kept, _height(law, kind, kept), poles, jumps)


def window(law: Family, kind: str) -> tuple[Numbers, Numbers]:
    """Give the ends of the curve in x: those of the support where they are near, else where little is left out."""
    low, high = (quantile(law, number(CUT), upper=side).value for side in (False, True))
    support = law.support()
    width = high - low
    low = support.lower if low - support.lower <= NEAR * width else low
    high = support.upper if support.upper - high <= NEAR * width else high
    if kind == "density" and not law.discrete:
        return _where_visible(law, low, high)
    return low, high


def _where_visible(law: Family, low: Numbers, high: Numbers) -> tuple[Numbers, Numbers]:
    """Cut heavy tails where the density is below a thousandth of its peak, if it has one."""
    peak = law.most_likely()
    top = law.density(peak)
    if not np.isfinite(top) or not np.isfinite(peak):
        return low, high
    sides = []
    for end in (low, high):
        steps = np.geomspace(1e-6, 1, 256) * (end - peak)
        seen = law.density(peak + steps) >= top / 1000
        sides.append(peak + steps[min(int(np.flatnonzero(seen).max(initial=0)) + 1, 255)] if seen.any() else end)
    return (sides[0] if low < peak else low), (sides[1] if high > peak else high)


def _marks(law: Family, low: Numbers, high: Numbers, shade: Event | None) -> Numbers:
    """Values that have to be points: the peak, and the bounds of the shaded event."""
    wanted = [law.most_likely(), *(bounds(law, shade) if shade is not None else ())]
    inside = [value for value in wanted if low < value < high]
    return np.array([low, *inside, high], dtype=np.float64)


def bounds(law: Family, event: Event) -> tuple[Numbers, Numbers]:
    """Give the bounds of an event, infinite where it has none."""
    if event.within is not None:
        mean, spread, _, _ = law.moments()
        return mean - event.within * spread, mean + event.within * spread
    return (-INFINITY if event.lower is None else event.lower), (INFINITY if event.upper is None else event.upper)


def _ends(law: Family, kind: str, low: Numbers, high: Numbers) -> tuple[list[Numbers], list[Numbers]]:
    """Give the ends of the support where a density is infinite, and those where it jumps to 0."""
    if kind != "density":
        return [], []
    poles, jumps = [], []
    for end, drawn in zip(law.support(), (low, high), strict=True):
        if end == drawn:
            height = law.density(end)
            if np.isinf(height):
                poles.append(end)
            elif height > 0:
                jumps.append(end)
    return poles, jumps


def _inside(law: Family, low: Numbers, high: Numbers, poles: list[Numbers]) -> tuple[Numbers, Numbers]:
    """Step away from the poles."""
    if low in poles:
        low = quantile(law, number(POLE_CUT), upper=False).value
    if high in poles:
        high = quantile(law, number(POLE_CUT), upper=True).value
    return low, high


def _trial(law: Family, low: Numbers, high: Numbers, marks: Numbers) -> Numbers:
    by_tail = [quantile(law, TAILS, upper=side).value for side in (False, True)]
    every = np.concatenate([np.linspace(low, high, FINE), *by_tail, marks])
    return np.unique(every[(every >= low) & (every <= high)])


def _height(law: Family, kind: str, x: Numbers) -> Numbers:
    if kind == "density":
        return law.density(x)
    tails = law.tails(x)
    return tails.at_most if kind == "cumulative" else tails.above


def refined(x: Numbers, height: Callable[[Numbers], Numbers], points: int) -> tuple[Numbers, Numbers]:
    """Halve trial intervals until none has more than half the bending that one of `points` may have."""
    y = height(x)
    for _ in range(ROUNDS):
        share = bending(x, y)
        crowded = np.flatnonzero(share > share.sum() / (2 * points))
        middles = (x[crowded] + x[crowded + 1]) / 2
        new = (middles > x[crowded]) & (middles < x[crowded + 1])
        if not new.any():
            break
        x = np.insert(x, crowded[new] + 1, middles[new])
        y = np.insert(y, crowded[new] + 1, height(middles[new]))
    return x, y


def bending(x: Numbers, y: Numbers) -> Numbers:
    """Estimate the integral of the square root of |second derivative| over each interval of rising x."""
    steps = np.diff(x)
    turn = np.abs(np.diff(np.diff(y) / steps)) * (steps[1:] + steps[:-1]) / 2
    root = np.sqrt(np.concatenate([[0], turn, [0]]))
    share: Numbers = (root[1:] + root[:-1]) / 2
    return share


def thinned(x: Numbers, y: Numbers, marks: Numbers, points: int) -> Numbers:
    """Choose of rising `x` at most `points` that share the bending of y equally, `marks` among them."""
    wanted = marks[(marks >= x[0]) & (marks <= x[-1])]
    if x.size <= points:
        return x
    share, steps = bending(x, y), np.diff(x)
    total = share.sum()
    share = share + LEAST_SHARE * (total if total > 0 else 1) * steps / steps.sum()
    along = np.concatenate([[0], np.cumsum(share)])
    even = np.linspace(0, along[-1], max(points - wanted.size, 2))
    nearest = np.searchsorted(along, even).clip(0, x.size - 1)
    return np.unique(np.concatenate([x[nearest], wanted]))


def _joined(x: Numbers, y: Numbers, poles: list[Numbers], jumps: list[Numbers]) -> Curve:
    """Add the poles (infinite) and the feet of the jumps to the ends."""
    for place, height in [*((pole, np.inf) for pole in poles), *((jump, 0.0) for jump in jumps)]:
        first = place <= x[0]
        x = np.concatenate([[place], x] if first else [x, [place]])
        y = np.concatenate([[height], y] if first else [y, [height]])
    return Curve(x, y, False)


def _discrete_curve(law: Family, kind: str, low: Numbers, high: Numbers, points: int) -> Curve:
    """Give masses, or the heights of the steps, at the possible values; of too many, those that share the bending."""
    values = law.values(low, high, MOST_VALUES)
    if values.size > points:
        values = thinned(values, _height(law, kind, values), values[[0, -1]], points)
    return Curve(values, _height(law, kind, values), True)


def _quantile_curve(law: Family, points: int) -> Curve:
    """Give values by probability, from end to end where the support has ends."""
    support = law.support()
    ends = [np.array([p]) for p, end in ((0.0, support.lower), (1.0, support.upper)) if np.isfinite(end)]
    every = np.concatenate([np.linspace(CUT, 1 - CUT, FINE), TAILS, 1 - TAILS, *ends])
    least, most = ((0.0 if np.isfinite(support.lower) else CUT), (1.0 if np.isfinite(support.upper) else 1 - CUT))
    probabilities = np.unique(every[(every >= least) & (every <= most)])
    values = quantile(law, probabilities, upper=False).value
    kept = thinned(probabilities, values, probabilities[[0, -1]], points)
    return Curve(kept, quantile(law, kept, upper=False).value, law.discrete)
