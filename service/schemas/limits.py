"""How much one request may ask."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Limits:
    """Bounds of a request, each a setting of the service."""

    entries: int = 100_000
    """Numbers in one array."""
    assets: int = 200
    """Assets that portfolios share."""
    components: int = 100
    """Components of a mixture."""
    questions: int = 1_000
    """Questions in one batch."""
    portfolios: int = 100_000
    """Portfolios in one ranking."""


DEFAULT_LIMITS = Limits()
