"""Laws are called as the service calls them: with numpy's floating-point warnings silenced."""

from collections.abc import Iterator

import numpy as np
import pytest


@pytest.fixture(autouse=True)
def _silenced() -> Iterator[None]:
    with np.errstate(all="ignore"):
        yield
