"""POST /v1/goal-requirements."""

from typing import Any

from service.core.goals import requirement
from service.core.goals.requirement import OF, WHICH
from service.core.goals.unknown import SOLVE_FOR
from service.core.parameters import Parameter
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Plain, Result
from service.schemas.fields import ChoiceField, NumberField
from service.schemas.goal_answers import goal_cautions, outlook_reasons, outlook_shape, outlook_values
from service.schemas.goal_plan import SAVING, GoalQuestion, plan_of, work_of
from service.schemas.question import Asked
from service.schemas.shapes import NULLABLE_TEXT, ONE, TEXT, Each, Figure, Fixed, Group

RUNS = 9
LONGEST_YEARS = 50.0
"""A plan whose horizon is solved for is counted as one of so many years."""


class GoalRequirementQuestion(GoalQuestion):
    """What does the plan need to succeed with a wanted probability? What is solved for is left out of the body."""

    one_of = (("returns", "glide_path"),)
    solve_for = ChoiceField(
        "what is left out: of contribution and withdrawal the amount of one flow", SOLVE_FOR, required=True
    )
    wanted_success_probability = NumberField(
        Parameter("wanted chance", at_least=1e-6, at_most=1 - 1e-6, example=0.85), required=True, arrays=False
    )
    of = ChoiceField("success (the default), or solvency: that every withdrawal is paid", OF)
    which = ChoiceField("of horizons: the first that reaches it (the default), or the last up to which it holds", WHICH)


ANSWER = AnswerShape(
    "GoalRequirement",
    {
        "solve_for": Fixed(TEXT),
        "outcome": Fixed({"type": "string", "enum": ["found", "unattainable"]}),
        "value": Figure("in the sign of its field; null where unattainable"),
        "value_pointer": Fixed(NULLABLE_TEXT | {"description": "where the value belongs in the request"}),
        "rounded": Each(
            {"to": Fixed(ONE), "value": Fixed(ONE), "success_probability": Fixed(ONE)},
            "the value rounded to the safe side, and the chance that it gives",
        ),
        "attainable_success_probability": Figure("the best chance there is, where the wanted one is unattainable"),
        "holds_after": Fixed(
            {"type": ["boolean", "null"], "description": "of horizons: whether every later one does"},
            optional=True,
        ),
        "outlook": Group(outlook_shape(), "the plan with the value filled in", nullable=True),
    },
    ("number",),
)
SOLVED: dict[str, Any] = SAVING | {
    "cash_flows": [{"every": "month", "from_year": 0, "to_year": 5}],
    "solve_for": "contribution",
    "wanted_success_probability": 0.85,
}
EXAMPLES = {"what to save each month": SOLVED}


@endpoint(
    "/v1/goal-requirements",
    name="GoalRequirement",
    question=GoalRequirementQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    work=lambda asked: RUNS * work_of(asked, LONGEST_YEARS),
)
def goal_requirements(asked: Asked) -> Result:
    """What does the plan need to succeed with this probability?"""
    target = asked.get("target")
    plan = plan_of(asked, () if target is None else (float(target),))
    found = requirement(
        plan,
        asked["solve_for"],
        float(asked["wanted_success_probability"]),
        asked.get("of", "success"),
        asked.get("which", "first"),
    )
    figures: dict[str, Any] = {
        "solve_for": found.solve_for,
        "outcome": found.outcome,
        "value": found.value,
        "value_pointer": "".join(f"/{step}" for step in found.value_path),
        "rounded": [Plain(each._asdict()) for each in found.rounded],
        "attainable_success_probability": found.attainable_success_probability,
        "outlook": None if found.outlook is None else outlook_values(found.outlook),
    }
    if found.solve_for == "horizon_years":
        figures["holds_after"] = found.holds_after
    reasons = {
        "/attainable_success_probability": "not_computed",
        "/value": "unattainable",
        "/outlook": "unattainable",
        "/holds_after": "unattainable",
    }
    said = found.cautions
    if found.outlook is not None:
        reasons |= outlook_reasons(found.outlook, "/outlook")
        said = (*found.outlook.cautions, *said)
    return Result(
        figures, found.method, found.numerical_error, found.numerical_error_kind, goal_cautions(*said), reasons
    )
