"""One discretisation of the Fourier integrals for the growth over n periods."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.compounding.step import Part, Step
from service.core.returns.compounding.trigonometric_sums import Complexes, series, transform
from service.core.returns.compounding.window import Window

RESOLVED = 2e-13
"""The transform of the growth has come to rest where it stays below this."""
FEWEST = 24
SLACK = 1.02
MOST_WORK = 1e8
"""Frequencies times nodes of one grid: about a quarter of a second."""
LATTICE_FROM = 4e6
"""From here on a Fourier transform on an even lattice is quicker, where the density allows one."""
MOST_FREQUENCIES = 1 << 17
PROBES = np.linspace(11 / 12, 1, 12)
NEGLIGIBLE = 2e-15
CUT = 8.0
"""exp(-8) at the last frequency: a smooth end where the transform has not come to rest."""


@dataclass(frozen=True)
class Band:
    """How far the frequencies go, in all and for each component, and whether the transform has come to rest there.

    `lattice`: whether the transform of one period is computed on an even lattice.
    """

    highest: float
    reaches: tuple[float, ...]
    resolved: bool
    lattice: bool = False


def band_of(step: Step, periods: int, window: Window) -> Band:
    """Find the frequency from which on the transform of the growth is below 2e-13, or up to which the work allows."""
    waves = window.width / (2 * np.pi)
    limits = [np.inf]
    if len(step.parts) > 1:
        limits = [_rest_of(part, lambda reach, nodes: reach * waves * nodes < MOST_WORK)[0] for part in step.parts]
    may_lattice = all(part.smooth for part in step.parts)
    highest = 8 / (window.deviation * np.sqrt(periods))
    while True:
        size, nodes = _transform_at(step, window, limits, highest * PROBES)
        share = highest * waves / MOST_FREQUENCIES if may_lattice else np.sqrt(highest * waves * nodes / MOST_WORK)
        resolved = bool((size**periods < RESOLVED).all())
        growth = min(1.5, 1 / share)
        if resolved or growth < 1.05:
            break
        highest *= growth
    if may_lattice and highest * waves * nodes > LATTICE_FROM:
        rests = [_rest_of(part, lambda reach, _: reach * waves < 2 * MOST_FREQUENCIES) for part in step.parts]
        if all(at_rest for _, at_rest in rests):
            return Band(highest, tuple(max(reach, highest) for reach, _ in rests), resolved, lattice=True)
    return Band(highest, tuple(limits), resolved)


def _rest_of(part: Part, allowed: Callable[[float, int], bool]) -> tuple[float, bool]:
    """Frequency from which on one component's transform is negligible, or beyond what is allowed; and whether it is."""
    x, weights = part.nodes(0.0)
    mean = weights @ x / weights.sum()
    reach = 4 / float(np.sqrt(weights @ np.square(x - mean) / weights.sum()) + 1e-300)
    while True:
        x, weights = part.nodes(reach)
        sizes = np.abs(np.exp(1j * np.multiply.outer(reach * PROBES, x)) @ weights)
        at_rest = bool((sizes < NEGLIGIBLE).all())
        if at_rest or not allowed(reach, x.size):
            return reach, at_rest
        reach *= 1.5


def _transform_at(step: Step, window: Window, limits: list[float], frequencies: Numbers) -> tuple[Numbers, int]:
    """Size of the continuous part's transform at some frequencies, and the number of nodes behind it."""
    total = np.zeros(frequencies.size, np.complex128)
    nodes = 0
    for part, limit in zip(step.parts, limits, strict=True):
        if frequencies[0] < limit:
            x, weights = part.nodes(frequencies[-1])
            nodes += x.size
            total += np.exp(1j * np.multiply.outer(frequencies, x - window.centre)) @ weights
    return np.abs(total), nodes


class Grid:
    """g_j(k) = E[max(1 - exp(L - k), 0)^j; G > 0], j = 0, 1, 2, for the log growth L counted from n times the centre.

    1 - exp(L - k) is large where L plus the greatest of j standard exponentials lies below k, so that g_j is the
    distribution function of that sum, with kernels 1/(iu), 1/(iu (1 + iu)), 2/(iu (1 + iu) (2 + iu)). On frequencies
    u_m = (m + 1/2) step, step = 2 pi/period, with the transform phi of one period,
    g_j(k) = S/2 + step/pi sum of Re[exp(i u_m k) conj(phi(u_m)^n) kernel_j(u_m)] + alias_j(k)
    (Abate & Whitt 1992 for the method). The half-shifted grid has no pole, and its alias is the sum over whole periods
    P of (-1)^m [g_j(k - mP) - (S - g_j(k + mP))]. P covers both tails, so that only the geometric part of j = 1, 2 is
    not negligible.
    """

    def __init__(self, step: Step, periods: int, window: Window, band: Band, stretch: float, smooth: bool) -> None:
        self.window = window
        self.period = SLACK * stretch * window.width
        self.step = 2 * np.pi / self.period
        self.highest = band.highest * stretch
        count = max(FEWEST, int(self.highest / self.step))
        found = self._on_lattice if band.lattice else self._on_nodes
        parts, mass, growth = found(step.parts, [stretch * reach for reach in band.reaches], count)
        points = step.values - window.centre
        atoms = transform(points, step.masses, self.step, count) if points.size else np.zeros(count)
        atom_mass = float(step.masses.sum())
        atom_growth = _exponential_moments(points, step.masses, window.high)
        # the probability of growth above 0 that is not one of the listed atoms
        self.alive = (mass + atom_mass) ** periods - atom_mass**periods
        self._log_growth = periods * np.log(growth + atom_growth)
        self._log_atoms = periods * np.log(atom_growth)
        self.frequencies: Numbers = (np.arange(float(count)) + 0.5) * self.step
        powers = np.conj((parts + atoms) ** periods - atoms**periods)
        if smooth:
            powers = powers * np.exp(-CUT * np.square(self.frequencies / self.highest))
        self.coefficients = self.step / np.pi * powers * kernels(self.frequencies)

    def _on_nodes(self, parts: tuple[Part, ...], reaches: list[float], count: int) -> tuple[Complexes, float, Numbers]:
        """Transform, mass and exponential moments of the components, each as far as its transform reaches."""
        total, mass, growth = np.zeros(count, np.complex128), 0.0, np.zeros(2)
        self.work = 0.0
        for part, reach in zip(parts, reaches, strict=True):
            here = max(1, int(min(count, reach / self.step)))
            x, weights = part.nodes(here * self.step)
            x = x - self.window.centre
            total[:here] += transform(x, weights, self.step, here)
            mass += float(weights.sum())
            growth += _exponential_moments(x, weights, self.window.high)
            self.work += float(here * x.size)
        return total, mass, growth

    def _on_lattice(
        self, parts: tuple[Part, ...], reaches: list[float], count: int
    ) -> tuple[Complexes, float, Numbers]:
        """The same from even steps in X over one period, so small that no frequency of one period folds back."""
        length = 1 << int((max(reaches) + self.highest) / self.step).bit_length()
        x: Numbers = self.window.low + self.period / length * np.arange(float(length))
        weights = self.period / length * np.sum([part.density(x + self.window.centre) for part in parts], axis=0)
        turned = np.fft.ifft(weights * np.exp(1j * np.pi / length * np.arange(length)))[:count] * length
        total = turned * np.exp(1j * self.window.low * self.step * (np.arange(count) + 0.5))
        self.work = 20.0 * length
        return total, float(weights.sum()), _exponential_moments(x, weights, self.window.high)

    def relative_gaps(self, k: Numbers) -> Numbers:
        """g_0, g_1, g_2 at k, along a new first axis; k is flat."""
        inside = np.clip(k, self.window.low, self.window.high)
        found = self.alive / 2 + series(inside, self.coefficients, self.step) + self._alias(inside)
        beyond = k > self.window.high
        if beyond.any():
            once, twice = self._growth_over(k[beyond])
            found[:, beyond] = [self.alive + 0 * once, self.alive - once, self.alive - 2 * once + twice]
        return np.where(k < self.window.low, 0.0, np.clip(found, 0.0, self.alive))

    def _growth_over(self, k: Numbers) -> Numbers:
        """E[exp(L - k)] and E[exp(2(L - k))] of what is not an atom, along a new first axis."""
        powers = np.multiply.outer(np.array([1.0, 2.0]), k)
        whole, atoms = (np.exp(logs[:, np.newaxis] - powers) for logs in (self._log_growth, self._log_atoms))
        return np.asarray(whole - atoms)

    def _alias(self, k: Numbers) -> Numbers:
        # over 1 + exp(P) and 1 + exp(2P), in the exponent as they may leave the doubles
        first, _ = self._growth_over(k + np.logaddexp(0, self.period))
        _, second = self._growth_over(k + np.logaddexp(0, 2 * self.period) / 2)
        return np.array([np.zeros_like(k), -first, second - 2 * first])


def kernels(u: Numbers) -> Complexes:
    """Give the three kernels, a row for each order."""
    once = 1 / (1j * u)
    twice = once / (1 + 1j * u)
    return np.array([once, twice, 2 * twice / (2 + 1j * u)])


def _exponential_moments(x: Numbers, weights: Numbers, highest: float) -> Numbers:
    """E[exp(X)] and E[exp(2X)] over what lies in the window: no further out is anything gained by one period alone."""
    inside = x <= highest
    x, weights = x[inside], weights[inside]
    return np.array([weights @ np.exp(np.minimum(k * x, 700.0)) for k in (1, 2)])
