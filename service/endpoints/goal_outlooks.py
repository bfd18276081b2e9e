"""POST /v1/goal-outlooks."""

from service.core.goals import outlook
from service.core.parameters import Parameter
from service.endpoints.declaration import endpoint
from service.schemas.answers import AnswerShape, Result
from service.schemas.fields import LevelsField, NumberField, TruthField
from service.schemas.goal_answers import goal_cautions, outlook_reasons, outlook_shape, outlook_values
from service.schemas.goal_plan import LARGEST, SAVING, GoalQuestion, plan_of, work_of
from service.schemas.question import Asked

MOST_TARGETS = 50


class GoalOutlookQuestion(GoalQuestion):
    """Will the plan reach its goal, and will the money last?"""

    one_of = (("target", "targets"), ("returns", "glide_path"))
    targets = LevelsField(
        Parameter("several targets, answered from one run", at_least=0, at_most=LARGEST, example=50000), MOST_TARGETS
    )
    sensitivities = TruthField("whether to say how the chance of success answers to changes")
    equally_likely_outcomes = NumberField(
        Parameter("adds so many outcomes from worst to best", at_least=2, at_most=1000, whole=True, example=10),
        arrays=False,
    )


ANSWER = AnswerShape("GoalOutlook", outlook_shape(), ("number",))
EXAMPLES = {"saving for five years": SAVING}


@endpoint(
    "/v1/goal-outlooks",
    name="GoalOutlook",
    question=GoalOutlookQuestion,
    answers=(ANSWER,),
    examples=EXAMPLES,
    work=lambda asked: work_of(asked, 0.0) * (6 if asked.get("sensitivities") else 1),
)
def goal_outlooks(asked: Asked) -> Result:
    """Will the plan reach its goal, and will the money last?"""
    targets = asked.get("targets") or (float(asked["target"]),)
    outcomes = asked.get("equally_likely_outcomes")
    found = outlook(
        plan_of(asked, targets), bool(asked.get("sensitivities")), None if outcomes is None else int(outcomes)
    )
    return Result(
        outlook_values(found),
        found.method,
        found.numerical_error,
        found.numerical_error_kind,
        goal_cautions(*found.cautions),
        outlook_reasons(found),
    )
