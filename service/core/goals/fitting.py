"""Small steps on the way to a refusal that names the place in the request."""

from collections.abc import Iterable, Iterator
from dataclasses import replace

from service.core.errors import Refusal
from service.core.parameters import Limit

WHOLE = 1e-9
"""Times this close, in years, are one."""


def placed_under(path: tuple[str | int, ...], refusals: Iterable[Refusal]) -> Iterator[Refusal]:
    """Lead refusals about a part of the request to where the part stands."""
    return (replace(refusal, path=(*path, *refusal.path)) for refusal in refusals)


def refusals_of_limits(*rows: tuple[str, float | None, Limit]) -> Iterator[Refusal]:
    """Check each number that is given against its limit."""
    for name, value, limit in rows:
        found = None if value is None else limit.refusal(name, value)
        if found:
            yield found
