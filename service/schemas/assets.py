"""Assets that portfolios share, and limits of their weights."""

from typing import Any

import numpy as np
from marshmallow import ValidationError

from service.core.parameters import Parameter
from service.core.portfolio.assets import MODELS, Assets
from service.core.returns import PERIODS_PER_YEAR
from service.schemas.faults import refuse, required
from service.schemas.fields import ChoiceField, Given, LevelsField, MatrixField, NumberField, StrictField, TextField
from service.schemas.json_schema import closed_object, reference
from service.schemas.members import read_members, read_object, read_rows
from service.schemas.returns import LONGEST_NAME, PERIODS_A_YEAR, SAMPLE_SIZE, check_count

MOST = 200
NEEDED = ("names", "expected_returns", "volatilities", "correlations")


class AssetNamesField(StrictField):
    """Names of the assets."""

    def read(self, value: Any) -> tuple[str, ...]:
        name = TextField("", LONGEST_NAME)
        if type(value) is not list:
            raise refuse("not_an_array", "A JSON array of names is needed.")
        check_count(len(value), MOST)
        faults, names = {}, []
        for index, entry in enumerate(value):
            try:
                names.append(name.read(entry))
            except ValidationError as error:
                faults[index] = error.messages
        if faults:
            raise ValidationError(faults)
        return tuple(names)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:  # noqa: ARG002
        return {
            "type": "array",
            "items": {"type": "string", "maxLength": LONGEST_NAME},
            "minItems": 1,
            "maxItems": MOST,
            "description": "names of the assets, each once",
        }


def asset_members() -> dict[str, StrictField]:
    """Make the fields of the shared assets."""
    freedom = Parameter("of the joint Student t law; needed by student_t", above=2, at_most=1e15, example=5)
    return {
        "names": AssetNamesField("names of the assets"),
        "expected_returns": LevelsField(
            Parameter("expected simple returns of one period", at_least=-1e6, at_most=1e6, example=0.05), MOST
        ),
        "volatilities": LevelsField(
            Parameter("standard deviations of the same", at_least=0, at_most=1e6, example=0.1), MOST
        ),
        "correlations": MatrixField("correlations of the assets' returns, row by row"),
        "model": ChoiceField("joint law of the returns; normal is the default", MODELS),
        "degrees_of_freedom": NumberField(freedom, arrays=False),
        "period": ChoiceField("the period of these returns; year is the default", tuple(PERIODS_PER_YEAR)),
        "periods_per_year": NumberField(PERIODS_A_YEAR, arrays=False),
        "sample_size": NumberField(SAMPLE_SIZE, arrays=False),
    }


class AssetsField(StrictField):
    """The assets that portfolios by weights share."""

    def __init__(self, meaning: str, *, required: bool = False) -> None:
        super().__init__(meaning, required=required)
        self.inner = asset_members()

    def read(self, value: Any) -> Given:
        given = read_object(value)
        found, faults = read_members(given, self.inner, self.limits)
        faults |= {name: [required(name)] for name in NEEDED if name not in given}
        if faults:
            raise ValidationError(faults)
        for name in ("expected_returns", "volatilities"):
            found[name] = np.array(found[name], np.float64)
        return Given({}, lambda: Assets(**found))

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        if "Assets" not in components:
            for field in self.inner.values():
                field.limits = self.limits
            members = {name: field.printed(components) for name, field in self.inner.items()}
            components["Assets"] = closed_object(
                members, optional=[n for n in members if n not in NEEDED], description=self.meaning
            )
        return reference("Assets")


SHARE = Parameter("share of the mix", at_least=0, at_most=1, example=0.4)
LIMIT_MEMBERS: dict[str, StrictField] = {
    "asset": TextField("one of the names under assets", LONGEST_NAME),
    "least": NumberField(SHARE, arrays=False),
    "most": NumberField(SHARE, arrays=False),
}


class WeightLimitsField(StrictField):
    """Limits of single weights, where 0 and 1 are too wide."""

    def read(self, value: Any) -> list[dict[str, Any]]:
        return read_rows(value, LIMIT_MEMBERS, ("asset",), self.limits)

    def printed(self, components: dict[str, Any]) -> dict[str, Any]:
        members = {name: field.printed(components) for name, field in LIMIT_MEMBERS.items()}
        row = closed_object(members, optional=("least", "most"))
        return {"type": "array", "items": row, "minItems": 1, "maxItems": MOST, "description": self.meaning}
