"""Long-only mixes of assets that are best against a floor: the frontier, the three objectives, the certificate."""

from service.core.portfolio.allocation.allocate import OBJECTIVES, Allocation, allocate

__all__ = ["OBJECTIVES", "Allocation", "allocate"]
