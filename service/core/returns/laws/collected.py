"""The laws of several portfolios as one."""

from collections.abc import Callable, Sequence
from typing import TypeAlias, TypeVar

import numpy as np
import numpy.typing as npt

from service.core.arrays import Numbers, Truths
from service.core.returns.law import Gaps, HorizonLaw, LogGrowth

Positions: TypeAlias = npt.NDArray[np.int64]
T = TypeVar("T", bound=np.generic)
Part: TypeAlias = tuple[HorizonLaw, Positions]


def side_by_side(pieces: Sequence[npt.NDArray[T]], positions: Sequence[Positions], count: int) -> npt.NDArray[T]:
    """Put figures that belong to `positions` next to each other along the last axis, of length `count`."""
    whole = np.empty((*np.atleast_1d(pieces[0]).shape[:-1], count), np.asarray(pieces[0]).dtype)
    for piece, places in zip(pieces, positions, strict=True):
        whole[..., places] = piece if piece.ndim else piece[()]
    return whole


def stacked(figures: Sequence[Numbers]) -> Numbers:
    """Put several figures of one law along a new first axis, with an axis for its portfolios even if it has one."""
    return np.stack(np.broadcast_arrays(*(np.atleast_1d(figure) for figure in figures)))


class CollectedLaw(HorizonLaw):
    """Laws side by side: each part answers for the portfolios at its positions, along the last axis of every figure.

    Thresholds and probabilities are single numbers, or have a last axis of length 1.
    """

    def __init__(self, parts: Sequence[Part], count: int) -> None:
        self.parts = parts
        self.count = count
        self.numerical_error = max(law.numerical_error for law, _ in parts)
        methods = {law.method for law, _ in parts}
        self.method = methods.pop() if len(methods) == 1 else "several_methods"
        self.numerical_error_kind = max(law.numerical_error_kind for law, _ in parts)  # "estimate" if any is one
        self.cautions = tuple(sorted({caution for law, _ in parts for caution in law.cautions}))
        self.work = sum(law.work for law, _ in parts)

    def _joined(self, figure: Callable[[HorizonLaw], npt.NDArray[T]]) -> npt.NDArray[T]:
        return side_by_side([figure(law) for law, _ in self.parts], [at for _, at in self.parts], self.count)

    def mean(self) -> Numbers:
        return self._joined(lambda law: law.mean())

    def standard_deviation(self) -> Numbers:
        return self._joined(lambda law: law.standard_deviation())

    def probability_below(self, threshold: Numbers) -> Numbers:
        return self._joined(lambda law: law.probability_below(threshold))

    def probability_at_most(self, threshold: Numbers) -> Numbers:
        return self._joined(lambda law: law.probability_at_most(threshold))

    def certain(self, threshold: Numbers) -> Truths:
        return self._joined(lambda law: law.certain(threshold))

    def gaps(self, threshold: Numbers) -> Gaps:
        both = self._joined(lambda law: stacked(law.gaps(threshold)))
        return Gaps(both[0], both[1])

    def quantile(self, probability: Numbers) -> Numbers:
        return self._joined(lambda law: law.quantile(probability))

    def upper_quantile(self, probability: Numbers) -> Numbers:
        return self._joined(lambda law: law.upper_quantile(probability))

    def expected_shortfall(self, probability: Numbers) -> Numbers:
        return self._joined(lambda law: law.expected_shortfall(probability))

    def log_growth(self) -> LogGrowth:
        both = self._joined(lambda law: stacked(law.log_growth()))
        return LogGrowth(both[0], both[1])

    def total_loss_probability(self) -> Numbers:
        return self._joined(lambda law: law.total_loss_probability())
