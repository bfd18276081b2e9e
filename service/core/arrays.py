"""The one number type of the core."""

from typing import TypeAlias

import numpy as np
import numpy.typing as npt

Numbers: TypeAlias = npt.NDArray[np.float64]
"""A float64 array, or one numpy.float64, which numpy treats alike: every formula serves one question and many.

Never a Python float: its overflow and division by zero raise where numpy gives infinity or nan.
"""

Truths: TypeAlias = npt.NDArray[np.bool_]


def number(value: float) -> Numbers:
    """Give one float64, typed as the array that it behaves like."""
    return np.float64(value)  # type: ignore[return-value]


MINUS_INFINITY = number(-np.inf)
INFINITY = number(np.inf)
NO_VALUE = number(np.nan)


def flat(*values: Numbers | Truths | float) -> tuple[tuple[int, ...], list[Numbers]]:
    """Broadcast together: the common shape, and each value as a flat float64 array of its own."""
    together = np.broadcast_arrays(*values)
    return together[0].shape, [np.array(value, dtype=np.float64).ravel() for value in together]
