"""The characteristic function of one period's log growth, from its distribution function alone.

Cells around the points of a lattice get their exact probabilities; the transform of those, over sin(kh/2)/(kh/2), is
the transform of the law itself but for frequencies beyond 2 pi/h - k, where it does not matter.
"""

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt
from scipy.fft import next_fast_len, rfft

from service.core.arrays import Numbers
from service.core.goals.step_law import StepLaw

AT_REST = 1e-9
"""A characteristic function below this does not matter."""
ROOM = 1.2
"""Frequencies are kept so much farther, as their end is tapered."""
FINEST = 60.0
"""Frequencies are followed to this many over the deviation, for laws whose function never comes to rest."""
ATOMS_TO = 28.8
"""The same for laws of single values, which are smooth only after many steps."""
FARTHEST = 500.0
"""Reach of one step, in its scales, that is followed: farther tails are cut where they hold more than 1e-11."""
TAILS = (1e-12, 1e-11, 1e-10, 1e-9, 1e-8, 1e-7, 1e-6, 1e-5)
MOST_CELLS = 50_000
"""Cells of a law that is narrow and wide at once; beyond, it is followed less finely, and the error shows it."""
SINGLE = 1e-12
LEAST_TAIL = 1e-15
"""Nearer to 1 there are no doubles."""
Complexes = npt.NDArray[np.complex128]


@dataclass(frozen=True)
class StepTransform:
    """One period's law prepared: centre of log growth, its reach on either side at a tail probability, frequencies."""

    law: StepLaw
    centre: float
    scale: float
    reach: float
    tail: float
    highest: float
    _cells: dict[float, Numbers] = field(default_factory=dict)

    @classmethod
    def of(cls, law: StepLaw, steps: int) -> "StepTransform":
        """Look at the law: where it lies, how far it reaches, how fast its characteristic function comes to rest."""
        low, centre, high = law.log_quantiles(np.array([0.25, 0.5, 0.75]))
        if law.certain:
            return cls(law, float(centre), 1.0, 0.0, TAILS[0], 0.0)
        atoms = law.atoms()
        if atoms is not None:
            logs, masses = atoms
            centre = float(masses @ logs / masses.sum())
            scale = float(np.sqrt(masses @ np.square(logs - centre) / masses.sum()))
            reach = float(np.abs(logs - centre).max())
            # a single value, beside a total loss, is smooth at any frequency
            return cls(law, centre, scale, reach, TAILS[0], ATOMS_TO / scale if scale > SINGLE else 0.0)
        scale = float(high - low) / 1.35 or law.deviation
        beyond = np.maximum(np.array(TAILS) / steps, LEAST_TAIL)
        reaches = np.maximum(centre - law.log_quantiles(beyond), law.log_quantiles(1 - beyond) - centre)
        at = int(np.argmin(np.append(reaches[:-1] > FARTHEST * scale, False)))
        reach = float(reaches[at])
        return cls(law, float(centre), scale, reach, TAILS[at], _rest(law, float(centre), scale, reach))

    def cells(self, spacing: float) -> Numbers:
        """Probabilities of the cells around the lattice points within reach; the ends take the tails."""
        if spacing not in self._cells:
            self._cells[spacing] = self._cells_at(spacing)
        return self._cells[spacing]

    def _cells_at(self, spacing: float) -> Numbers:
        half = int(np.ceil(self.reach / spacing)) + 1
        edges: Numbers = (np.arange(-half, half, dtype=np.float64) + 0.5) * spacing + self.centre
        below = np.concatenate([[0.0], self.law.at_most(edges), [self.law.survival]])
        return np.diff(below)

    def transform(self, spacing: float, length: int, count: int) -> Complexes:
        """E[exp(-i k (log G - centre)); G > 0] at the first frequencies k of a lattice of this length."""
        step = 2 * np.pi / (length * spacing)
        atoms = self.law.atoms()
        if atoms is not None:
            return outer_transform(atoms[0] - self.centre, atoms[1], step, count)
        cells = self.cells(spacing)
        half = cells.size // 2
        wrapped = np.zeros(length)
        np.add.at(wrapped, np.arange(-half, half + 1) % length, cells)
        found = np.empty(count, np.complex128)
        found[:] = rfft(wrapped)[:count]
        found /= np.sinc(np.arange(float(count)) / length)
        return found


def _rest(law: StepLaw, centre: float, scale: float, reach: float) -> float:
    """Find the frequency from which on the characteristic function is below 1e-9, at most 60 over the scale."""
    finest = min(FINEST / scale, MOST_CELLS / reach)
    trial = StepTransform(law, centre, scale, reach, 0.0, finest)
    spacing = np.pi / finest / 2
    length = next_fast_len(2 * int(np.ceil(reach / spacing)) + 4)
    count = length // 2
    sizes = np.abs(trial.transform(spacing, length, count))
    above = np.flatnonzero(sizes > AT_REST)
    k = 2 * np.pi / (length * spacing) * float(above[-1] + 1)
    return min(max(ROOM * k, 4 / scale), finest)


def outer_transform(places: Numbers, masses: Numbers, step: float, count: int) -> Complexes:
    """Sum of masses exp(-i k places) for k = 0, step, 2 step, ...: coarse and fine frequencies multiplied out."""
    fine = int(np.ceil(np.sqrt(count)))
    coarse = np.exp(-1j * fine * step * np.multiply.outer(np.arange(-(-count // fine)), places))
    found = (coarse * masses) @ np.exp(-1j * step * np.multiply.outer(places, np.arange(fine)))
    return np.asarray(found.ravel()[:count], np.complex128)
