"""A distribution: the tagged union of all families."""

from collections.abc import Iterable, Iterator
from typing import Any

from service.core.declared import Parameterisation
from service.core.distributions import FAMILIES
from service.core.parameters import Components
from service.schemas.declared import DeclaredField
from service.schemas.numbers import number_list


class DistributionField(DeclaredField):
    """A family and its parameters."""

    tag = "family"
    kinds = FAMILIES
    unknown_code = "unknown_family"
    component = "Distribution"

    def _ways(self) -> Iterator[tuple[str, Parameterisation]]:
        for kind in self.kinds.values():
            for way in kind.parameterisations:
                yield kind.name, way

    @property
    def members(self) -> Iterable[str]:
        return {self.tag, *(name for _, way in self._ways() for name in way.parameters)}

    @property
    def lists(self) -> frozenset[str]:
        return frozenset(name for _, way in self._ways() for name in way.lists - self.only_in_post)

    @property
    def only_in_post(self) -> frozenset[str]:
        return frozenset(
            name for _, way in self._ways() for name, p in way.parameters.items() if isinstance(p, Components)
        )

    def flat(self, name: str) -> Iterator[tuple[str, str, dict[str, Any]]]:  # noqa: ARG002
        yield self.tag, "which distribution family", {"type": "string", "enum": list(self.kinds)}
        meanings: dict[str, list[str]] = {}
        for kind, way in self._ways():
            for parameter in (p for p in way.parameters.values() if p.name not in self.only_in_post):
                meanings.setdefault(parameter.name, []).append(f"{kind}: {parameter.meaning}")
        for parameter_name, words in meanings.items():
            yield parameter_name, "; ".join(words), number_list(self.limits)
