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
SHORTEST_LATTICE = 1 << 14
LONGEST_LATTICE = 1 << 20
UNFOLDED = 1e-13
"""A transform below this may fold back."""
PROBES = np.linspace(11 / 12, 1, 8)
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
        limits = [_rest_of(part, lambda reach, nodes: reach * waves * nodes < MOST_WORK) for part in step.parts]
    highest = 8 / (window.deviation * np.sqrt(periods))
    on_lattice: Band | None = None
    tried = False
    while True:
        bound, nodes = _bound_at(step, periods, limits, highest * PROBES)
        resolved = bool((bound < RESOLVED).all())
        work = highest * waves * nodes
        if work > LATTICE_FROM and not tried and all(part.smooth for part in step.parts):
            tried = True
            on_lattice = lattice_band(step, periods, window)
        if on_lattice:
            return on_lattice
        growth = min(1.5, float(np.sqrt(MOST_WORK / work)))
        if resolved or growth < 1.05:
            return Band(highest * min(growth, 1), tuple(limits), resolved and growth >= 1)
        highest *= growth


def lattice_band(step: Step, periods: int, window: Window) -> Band | None:
    """Find the band from transforms on ever finer lattices; None where the finest still leaves something out."""
    period = SLACK * window.width
    atoms = step.masses.sum()
    length = SHORTEST_LATTICE
    while length <= LONGEST_LATTICE:
        sizes = np.abs(_lattice_transform(step, window, period, length)[0][: length // 2])
        if sizes[-length // 16 :].max() < UNFOLDED:
            frequency = 2 * np.pi / period
            rest = np.flatnonzero(sizes >= UNFOLDED)[-1] + 1
            highest = np.flatnonzero((sizes + atoms) ** periods - atoms**periods >= RESOLVED)[-1] + 1
            return Band(float(highest * frequency), (float(rest * frequency),), resolved=True, lattice=True)
        length *= 4
    return None


def _lattice_transform(step: Step, window: Window, period: float, length: int) -> tuple[Complexes, Numbers, Numbers]:
    """Transform of the components on the half-shifted grid, from even steps in X over one period; with the steps."""
    x: Numbers = window.low + period / length * np.arange(float(length))
    weights = period / length * np.sum([part.density(x + window.centre) for part in step.parts], axis=0)
    turned = np.fft.ifft(weights * np.exp(1j * np.pi / length * np.arange(length))) * length
    return turned, x, weights


def _rest_of(part: Part, allowed: Callable[[float, int], bool]) -> float:
    """Frequency from which on one component's transform is negligible, or beyond what is allowed."""
    x, weights = part.nodes(0.0)
    mean = weights @ x / weights.sum()
    reach = 4 / float(np.sqrt(weights @ np.square(x - mean) / weights.sum()) + 1e-300)
    while True:
        x, weights = part.nodes(reach)
        sizes = np.abs(np.exp(1j * np.multiply.outer(reach * PROBES, x)) @ weights)
        if (sizes < NEGLIGIBLE).all() or not allowed(reach, x.size):
            return reach
        reach *= 1.5


def _bound_at(step: Step, periods: int, limits: list[float], frequencies: Numbers) -> tuple[Numbers, int]:
    """Bound on the growth's transform, less that of its listed values, and the number of nodes behind it.

    From the sizes of the components' transforms: together they may cancel at one frequency and not at a higher one.
    """
    total = np.zeros(frequencies.size)
    nodes = 0
    for part, limit in zip(step.parts, limits, strict=True):
        if frequencies[0] < limit:
            x, weights = part.nodes(frequencies[-1])
            nodes += x.size
            total += np.abs(np.exp(1j * np.multiply.outer(frequencies, x)) @ weights)
    atoms = step.masses.sum()
    return (total + atoms) ** periods - atoms**periods, nodes


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
        parts, mass, growth = found(step, [stretch * reach for reach in band.reaches], count)
        points = step.values - window.centre
        atoms = transform(points, step.masses, self.step, count) if points.size else np.zeros(count)
        atom_mass = float(step.masses.sum())
        atom_growth = _exponential_moments(points, step.masses, window.high)
        # the probability of growth above 0 that is not one of the listed atoms
        self.alive = (mass + atom_mass) ** periods - atom_mass**periods
        # a moment that is made beyond the window has no part in the alias: there exp(L - k) is cut at 1
        inside = window.exponent > np.array([1.0, 2.0])
        self._log_growth = np.where(inside, periods * np.log(growth + atom_growth), -np.inf)
        self._log_atoms = np.where(inside, periods * np.log(atom_growth), -np.inf)
        self.frequencies: Numbers = (np.arange(float(count)) + 0.5) * self.step
        powers = np.conj((parts + atoms) ** periods - atoms**periods)
        if smooth:
            powers = powers * np.exp(-CUT * np.square(self.frequencies / self.highest))
        self.coefficients = self.step / np.pi * powers * kernels(self.frequencies)

    def _on_nodes(self, step: Step, reaches: list[float], count: int) -> tuple[Complexes, float, Numbers]:
        """Transform, mass and exponential moments of the components, each as far as its transform reaches."""
        total, mass, growth = np.zeros(count, np.complex128), 0.0, np.zeros(2)
        self.work = 0.0
        for part, reach in zip(step.parts, reaches, strict=True):
            here = max(1, int(min(count, reach / self.step)))
            x, weights = part.nodes(here * self.step)
            x = x - self.window.centre
            total[:here] += transform(x, weights, self.step, here)
            mass += float(weights.sum())
            growth += _exponential_moments(x, weights, self.window.high)
            self.work += float(here * x.size)
        return total, mass, growth

    def _on_lattice(self, step: Step, reaches: list[float], count: int) -> tuple[Complexes, float, Numbers]:
        """The same from even steps in X over one period, so small that no frequency of one period folds back."""
        length = 1 << int((max(reaches) + self.highest) / self.step).bit_length()
        turned, x, weights = _lattice_transform(step, self.window, self.period, length)
        shift = np.exp(1j * self.window.low * self.step * (np.arange(count) + 0.5))
        self.work = 20.0 * length
        return turned[:count] * shift, float(weights.sum()), _exponential_moments(x, weights, self.window.high)

    def relative_gaps(self, k: Numbers) -> Numbers:
        """g_0, g_1, g_2 at k, along a new first axis; k is flat."""
        inside = np.clip(k, self.window.low, self.window.high)
        found = self.alive / 2 + series(inside, self.coefficients, self.step) + self._alias(inside)
        beyond = k > self.window.high
        if beyond.any():
            once, twice = self._growth_over(k[beyond])
            found[:, beyond] = [self.alive + 0 * once, self.alive - once, self.alive - 2 * once + twice]
        return np.where(k < self.window.low, 0.0, np.clip(found, 0.0, self.alive))

    def distribution(self, k: Numbers) -> Numbers:
        """g_0 alone; k is flat."""
        inside = np.clip(k, self.window.low, self.window.high)
        (found,) = series(inside, self.coefficients[:1], self.step)
        found = np.clip(self.alive / 2 + found, 0.0, self.alive)
        return np.where(k < self.window.low, 0.0, np.where(k > self.window.high, self.alive, found))

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
