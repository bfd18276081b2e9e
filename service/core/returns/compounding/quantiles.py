"""Quantiles of a growth whose distribution function is a trigonometric sum."""

from collections.abc import Callable
from functools import cached_property

import numpy as np

from service.core.arrays import Numbers
from service.core.returns.compounding.grid import Grid
from service.core.returns.search import first_reaching

FINENESS = 4
"""Points of the table for each frequency: half a step is at most an eighth of the shortest wave."""
LEAST_LENGTH = 256
TERMS = 12
NEWTON_STEPS = 5
MOST_TABULATED = 10_000
"""Frequencies; with more the sum itself is searched, as the table would take much memory."""
FACTORIALS = np.cumprod([1.0, *range(1, TERMS)])


class QuantileTable:
    """The distribution function and eleven derivatives on an even grid, by fast Fourier transforms.

    Between the grid points the Taylor polynomial of the nearest one: error 1e-10 of the highest frequency's term, which
    is below 1e-12 itself.
    """

    def __init__(self, grid: Grid) -> None:
        self._grid = grid

    @cached_property
    def _derivatives(self) -> Numbers:
        """Derivative q at point i times spacing^q/q!: rows are points."""
        u = self._grid.frequencies
        length = 1 << (max(LEAST_LENGTH, FINENESS * u.size) - 1).bit_length()
        spacing = self._grid.period / length
        powers = (1j * u * spacing) ** np.arange(TERMS)[:, np.newaxis] / FACTORIALS[:, np.newaxis]
        terms = np.zeros((TERMS, length), np.complex128)
        terms[:, : u.size] = self._grid.coefficients[0] * np.exp(1j * u * self._grid.window.low) * powers
        turned = np.fft.ifft(terms, axis=1) * (length * np.exp(1j * np.pi * np.arange(length) / length))
        turned.real[0] += self._grid.alive / 2
        return np.ascontiguousarray(turned.real.T)

    @property
    def _spacing(self) -> float:
        return float(self._grid.period / self._derivatives.shape[0])

    def _at(self, k: Numbers) -> tuple[Numbers, Numbers]:
        """Distribution function and density times spacing, by the polynomial of the nearest point."""
        place = (k - self._grid.window.low) / self._spacing
        nearest = np.clip(np.rint(place), 0, self._derivatives.shape[0] - 1)
        d = np.clip(place - nearest, -1, 1)
        terms = self._derivatives[nearest.astype(np.intp)]
        value, slope = terms[:, -1].copy(), np.zeros_like(d)
        for q in range(TERMS - 2, -1, -1):
            slope = slope * d + value
            value = value * d + terms[:, q]
        return value, slope

    def reaching(self, probability: Numbers, atoms: Callable[[Numbers], Numbers] | None) -> Numbers:
        """Give k at which the probability is reached, flat; `atoms` gives the probability of listed values up to k."""
        window = self._grid.window
        if self._grid.frequencies.size > MOST_TABULATED:
            low, high = (np.full(probability.shape, end) for end in (window.low, window.high))
            return first_reaching(
                lambda k: self._grid.distribution(k) + (atoms(k) if atoms else 0.0) - probability, low, high
            )
        spacing = self._spacing
        count = min(int(window.width / spacing) + 2, self._derivatives.shape[0])
        places = window.low + spacing * np.arange(count)
        reached = np.maximum.accumulate(self._derivatives[:count, 0] + (atoms(places) if atoms else 0.0))
        upper = np.clip(np.searchsorted(reached, probability), 1, count - 1)
        low, high = places[upper - 1], places[upper]
        if atoms:
            return first_reaching(lambda k: self._at(k)[0] + atoms(k) - probability, low, high)
        share = (probability - reached[upper - 1]) / np.maximum(reached[upper] - reached[upper - 1], 1e-300)
        k = low + spacing * np.clip(share, 0, 1)
        for _ in range(NEWTON_STEPS):
            value, slope = self._at(k)
            step = (value - probability) / np.maximum(slope, 1e-300)
            k = np.clip(k - spacing * step, low, high)
        return np.asarray(k)
