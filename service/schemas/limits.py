"""How much one request may ask."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Limits:
    """Bounds of a request, each a setting of the service."""

    entries: int = 100_000
    """Numbers in one array."""
    rows: int = 200
    """Rows of a short list: assets, weights, cash flows, legs of a glide path."""
    components: int = 100
    """Components of a mixture."""
    questions: int = 1_000
    """Questions in one batch."""
    portfolios: int = 100_000
    """Portfolios in one ranking."""


DEFAULT_LIMITS = Limits()
