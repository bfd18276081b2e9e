"""Growth of any law between cash flows: log wealth on an even lattice, growth by its characteristic function.

Lattice steps are h = 0.6 pi/k_most, k_most the frequency beyond which the characteristic function of one step does not
matter. Points that are not even are first spread over the lattice by a normal density of deviation 1.4 h, growth is
applied by a Fourier transform that divides that density out again, and once more, so that what results is a mixture
of normal laws of deviation 1.4 h around the lattice points with exactly the law wanted: the same form as for
normal log growth.
"""

from dataclasses import dataclass, field
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy.fft import irfft, rfft

from service.core.arrays import Numbers, Truths
from service.core.goals.points import Points, Spread
from service.core.goals.quadrature import Quadrature
from service.core.goals.step_transform import Complexes, StepTransform

SMOOTHING = 1.4
"""Deviation of the normal densities, in lattice steps."""
BAND = 0.6
"""Share of the frequencies of the lattice that is used; the rest is tapered."""
TAPER = 36.0
PADDING = 256
"""How far, in lattice steps, the tapered transform rings."""


def few_lengths(least: int) -> int:
    """Give a length of 2^p or 3 2^p, at least this: few of them, so that transforms are used again."""
    power = 1 << (least - 1).bit_length()
    return 3 * power // 4 if 3 * power // 4 >= least else power


@dataclass(frozen=True)
class LatticeGrowth:
    """Growth from each date to the next: `periods` of the law transforms[laws[i]], and a certain log growth besides."""

    method: ClassVar[str] = "lattice_fourier"
    error_share: ClassVar[float] = 10.0

    transforms: tuple[StepTransform, ...]
    laws: npt.NDArray[np.int64]
    periods: npt.NDArray[np.int64]
    drifts: Numbers
    quadrature: Quadrature
    h: float
    _filters: dict[tuple[object, ...], Complexes] = field(default_factory=dict)

    @property
    def discrete(self) -> bool:
        """Whether some law takes single values."""
        return any(transform.law.law.discrete for transform in self.transforms)

    @property
    def random(self) -> Truths:
        """Whether growth from each date to the next is uncertain."""
        return np.array([not t.law.certain for t in self.transforms])[self.laws]

    def _each(self, values: list[float]) -> Numbers:
        found: Numbers = np.array(values)[self.laws] * self.periods
        return found

    @property
    def certain(self) -> Numbers:
        """Log growth where it is certain."""
        return self._each([transform.centre for transform in self.transforms]) + self.drifts

    @property
    def log_factors(self) -> Numbers:
        """Logarithm of E[G]."""
        return self._each([transform.law.log_factor for transform in self.transforms]) + self.drifts

    @property
    def survival(self) -> Numbers:
        """P(G > 0) of each."""
        return np.array([transform.law.survival for transform in self.transforms])[self.laws] ** self.periods

    @property
    def error_floor(self) -> float:
        """Rounding, or three times the probability beyond the lattice, over the whole plan."""
        return max(1e-11, *(3 * transform.tail for transform in self.transforms))

    def drift(self, start: int, end: int) -> float:
        """Give the centre of the log growth between two dates."""
        return float(self.certain[start:end].sum())

    def deviation(self, start: int, end: int) -> float:
        """Give an eighth of how far growth between two dates reaches."""
        return self._reach(start, end) / 8

    def _counts(self, start: int, end: int) -> tuple[int, ...]:
        """Periods of each law between two dates."""
        found = np.bincount(self.laws[start:end], self.periods[start:end], len(self.transforms))
        return tuple(int(n) for n in found)

    def _reach(self, start: int, end: int) -> float:
        reach = 0.0
        for n, transform in zip(self._counts(start, end), self.transforms, strict=True):
            if n and not transform.law.certain:
                reach += min(n * transform.reach, transform.reach + 10 * transform.scale * float(np.sqrt(n)))
        return reach

    def spread(self, points: Points, shift: float, start: int, end: int) -> Spread:
        """Give the law of wealth at date `end`, before its flow, from the points after the flow at `start`."""
        smoothed = SMOOTHING * self.h
        removed = 1
        if points.rest > 0 or points.spacing != self.h:
            points = self.quadrature.after_inflow(Spread(points, shift, smoothed), 0.0, self.h)
            shift, removed = 0.0, 2
        if points.masses.size == 0:
            return Spread(points, shift, smoothed)
        half = int(np.ceil(self._reach(start, end) / self.h)) + PADDING
        length = few_lengths(points.masses.size + 2 * half)
        self.quadrature.work.add(15 * length)
        factors = self._filter(self._counts(start, end), removed, length)
        found = irfft(rfft(points.masses, length) * factors, length)
        masses = np.concatenate([found[length - half :], found[: points.masses.size + half]])
        grown = self.trimmed(Points(self.h, points.first - half, masses))
        return Spread(grown, shift + self.drift(start, end), smoothed)

    def _filter(self, counts: tuple[int, ...], removed: int, length: int) -> Complexes:
        """Give the transform of the growth over some normal densities, 0 beyond the band."""
        key = (counts, removed, length)
        if key not in self._filters:
            count = int(BAND * length / 2)
            share = np.arange(count) / (BAND * length / 2)
            k = BAND * np.pi / self.h * share
            real = np.exp(removed * np.square(SMOOTHING * self.h * k) / 2 - TAPER * share**20)
            inner: Complexes = np.asarray(real, np.complex128)
            for index, n in enumerate(counts):
                if n and not self.transforms[index].law.certain:
                    inner *= self._transform(index, length, count) ** n
            self._filters[key] = np.zeros(length // 2 + 1, np.complex128)
            self._filters[key][:count] = inner
        return self._filters[key]

    def _transform(self, index: int, length: int, count: int) -> Complexes:
        key = (index, length)
        if key not in self._filters:
            self.quadrature.work.add(100 * length)
            self._filters[key] = self.transforms[index].transform(self.h, length, count)
        return self._filters[key]

    def spacing(self, spread: Spread, start: int, end: int, ratio: float) -> float:  # noqa: ARG002 - one for all
        """Give the distance of the points: that of the lattice."""
        return self.h

    def trimmed(self, points: Points) -> Points:
        """Put the outermost mass, next to nothing, on the outermost points that are kept."""
        cumulative = np.cumsum(np.abs(points.masses))
        if cumulative.size == 0 or cumulative[-1] <= 0:
            return Points(points.spacing, points.first, np.zeros(0), points.rest)
        least = self.error_floor / (12 * self.laws.size)
        first = int(np.searchsorted(cumulative, min(least, cumulative[-1] / 2)))
        last = int(np.searchsorted(cumulative, cumulative[-1] - min(least, cumulative[-1] / 2)))
        kept = points.masses[first : last + 1].copy()
        kept[0] += points.masses[:first].sum()
        kept[-1] += points.masses[last + 1 :].sum()
        return Points(points.spacing, points.first + first, kept, points.rest)
