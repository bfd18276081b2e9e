"""Inputs that look like a slip: answered as asked, with a caution."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from service.schemas.answers import Caution

OFTEN_TOO_LARGE = 20
"""So many times the mean a spread of 1 or more looks like per cent beside decimals."""
HALF = 0.5


def spread_in_percent(given: Mapping[str, Any], centre: str, spread: str, pointer: str) -> list[Caution]:
    """Find a spread of 1 or more beside a centre that is small and not 0: 12 beside 0.06."""
    if centre not in given or spread not in given:
        return []
    middle, width = given[centre], given[spread]
    size = abs(middle)
    looks = (width >= 1) & (size > 0) & (size < 1) & (width / OFTEN_TOO_LARGE >= size)
    if not np.any(looks):
        return []
    at = int(np.argmax(looks)) if np.ndim(looks) else None
    width, middle = (float(v if np.ndim(v) == 0 else v[at]) for v in (width, middle))
    place = f"{pointer}/{spread}" + (f"/{at}" if np.ndim(given[spread]) else "")
    words = f"A {spread.replace('_', ' ')} of {width:g} beside a {centre.replace('_', ' ')} of {middle:g}"
    return [
        Caution(
            "looks_like_percent",
            f"{words} was perhaps meant as {width / 100:g}.",
            place,
            {"given": width, "perhaps": width / 100, "occurrences": int(np.count_nonzero(looks))},
        )
    ]


def unusual_levels(levels: Sequence[float], quantile_probability: float) -> list[Caution]:
    """Find levels at or below one half and a quantile probability at or above it: the other tail was perhaps meant."""
    found = [(f"/confidence_levels/{at}", level) for at, level in enumerate(levels) if level <= HALF]
    if quantile_probability >= HALF:
        found.append(("/quantile_probability", quantile_probability))
    words = "A tail is usually the smaller part of all outcomes; was {:.12g} meant?"
    return [
        Caution("unusual_level", words.format(1 - given), pointer, {"given": given, "perhaps": 1 - given})
        for pointer, given in found
    ]


def threshold_in_percent(threshold: Any) -> list[Caution]:
    """Find a floor of 100 % or more: 2 for 0.02."""
    looks = threshold >= 1
    if not np.any(looks):
        return []
    at = int(np.argmax(looks)) if np.ndim(threshold) else None
    given = float(threshold if at is None else threshold[at])
    return [
        Caution(
            "looks_like_percent",
            f"A threshold of {given:g} asks for {given:.0%}; was {given / 100:g} meant?",
            "/threshold" + ("" if at is None else f"/{at}"),
            {"given": given, "perhaps": given / 100, "occurrences": int(np.count_nonzero(looks))},
        )
    ]
