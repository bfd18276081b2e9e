"""How much a question may make the service compute, counted before it is computed."""

from service.core.errors import DoesNotFit, Refusal

MOST_LAWS = 1_000
"""Laws of many periods in one question, where each is computed for itself."""
MOST_WORK = 1e9
"""Multiplications in one question: about two seconds."""
OF_A_LAW = 5e5
"""What any law of many periods takes beside its own, in multiplications."""


def refuse_beyond(laws: int, most: int) -> None:
    """Refuse so many different laws that have to be computed one by one."""
    if laws > most:
        detail = (
            f"The laws of {laws} different portfolios would have to be computed one by one; at most {most} are in one "
            "question. Send fewer at a time, or use a law that has a closed form over this horizon."
        )
        raise too_much_work(("horizon_years",), detail, laws, most)


def refuse_work(work: float) -> None:
    """Refuse a question whose laws together take too long."""
    if work > MOST_WORK:
        detail = "The laws over this horizon take too long to compute; ask for fewer at a time, or for a longer period."
        raise too_much_work(("horizon_years",), detail, work, MOST_WORK)


def too_much_work(path: tuple[str | int, ...], detail: str, work: float, limit: float) -> DoesNotFit:
    """Make the refusal of work beyond a limit."""
    return DoesNotFit([Refusal(path, "too_much_work", detail, {"work": work, "limit": limit})])


def thresholds_beyond(given: int, most: int) -> DoesNotFit:
    """Make the refusal of more thresholds (or outcomes) than one law over this horizon answers at once."""
    detail = f"Over this horizon the law answers at most {most} thresholds at once; these are {given}."
    return too_much_work(("threshold",), detail, given, most)


def not_accurate_enough(numerical_error: float, limit: float) -> DoesNotFit:
    """Make the refusal of a law whose density is too spiky for the frequencies that may be computed."""
    detail = (
        f"The law over this horizon would be off by up to {numerical_error:.2g}, as the return of one period is too "
        "concentrated for its tails; ask for more periods, or give parameters further from the end of their range."
    )
    params = {"numerical_error": numerical_error, "limit": limit}
    return DoesNotFit([Refusal(("horizon_years",), "not_accurate_enough", detail, params)])
