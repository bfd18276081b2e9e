"""What the core answers when a question does not fit: which field, why, and in which entry of an array."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from service.core.codes import require_listed


@dataclass(frozen=True, slots=True)
class Refusal:
    """One thing that does not fit.

    `path` leads from the asked object to the place, by names and positions; an empty path means the object
    as a whole. `code` is listed in `service.core.codes`; `params` holds the figures that `detail` puts in words.
    """

    path: tuple[str | int, ...]
    code: str
    detail: str
    params: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        require_listed(self.code)


class DoesNotFit(ValueError):
    """Raised with every refusal that was found, so that a client can mend all of them at once."""

    def __init__(self, refusals: Iterable[Refusal]) -> None:
        self.refusals = tuple(refusals)
        super().__init__("; ".join(refusal.detail for refusal in self.refusals))
