"""Every code that an answer may carry, with its meaning. Codes are never renamed; new ones may join."""

FAULTS = {
    # 400: what cannot be read
    "no_body": "The body is empty; a JSON object is needed.",
    "not_json": "The body is not JSON; `line` and `column` say where reading stopped.",
    "not_utf8": "The text is not UTF-8, or an escape stands for half a character.",
    "duplicate_key": "A key stands twice in one object.",
    "too_deep": "Objects and lists are nested too deeply.",
    "number_out_of_range": "A number is too large for a double, or an integer has too many digits.",
    "broken_percent": "The percent-encoding of the query is broken.",
    "broken_body": "The body ends early, or its chunks are broken.",
    "broken_request": "The request line or a header cannot be read.",
    # 413, 414, 431
    "body_too_large": "The body is longer than the service reads.",
    "url_too_long": "The address is longer than the service reads; send the question by POST.",
    "headers_too_large": "The headers are longer or more than the service reads.",
    # 422: what does not fit
    "not_an_object": "A JSON object is needed.",
    "not_an_array": "A JSON array is needed.",
    "not_a_number": "A JSON number is needed: no text, no true or false.",
    "not_text": "A JSON string is needed.",
    "not_true_or_false": "true or false is needed.",
    "integer_too_large": "Whole numbers beyond 2^53 are not exact in a double.",
    "must_be_whole": "A whole number is needed; 2.0 counts as whole.",
    "required": "The field is needed and missing (null counts as missing).",
    "unknown_field": "There is no such field; `closest` names one that is spelt nearly so.",
    "unknown_family": "There is no such distribution family.",
    "unknown_model": "There is no such return model.",
    "unknown_choice": "The value is none of those listed in `allowed`.",
    "unknown_format": "The answer is not offered in that format.",
    "does_not_go_together": "The field belongs to another way of asking than the fields beside it.",
    "given_twice": "A query parameter stands twice; a list is comma-separated.",
    "only_in_post": "The field can be sent by POST alone.",
    "empty": "A list needs an entry.",
    "too_few": "The list needs more entries.",
    "too_many": "The list has more entries than the service takes.",
    "too_long": "The text is longer than the service takes.",
    "lengths_differ": "All arrays of one question have one length; single numbers stretch to it.",
    "no_arrays": "A list of numbers cannot stand here; one number is needed.",
    "must_be_positive": "The number must be above 0.",
    "must_not_be_negative": "The number must be 0 or more.",
    "must_be_above": "The number must be above the limit.",
    "must_be_at_least": "The number must reach the limit.",
    "must_be_below": "The number must be below the limit.",
    "must_be_at_most": "The number must not exceed the limit.",
    "out_of_order": "Two parameters are in the wrong order; `rule` says which comes first.",
    "not_representable": "The parameters are so extreme that a double cannot hold what follows from them.",
    "compounding_not_available": "The return model does not take this compounding.",
    "horizon_not_divisible": "The horizon is no whole number of periods, and the law of the returns does not divide.",
    "not_accurate_enough": "The law cannot be computed accurately enough; `numerical_error` and `limit` say how far off.",
    "too_much_work": "The question would take too long to compute; `work` and `limit` say by how much.",
    "predictive_not_available": "The uncertainty of the estimates cannot be included for this return model.",
    "must_add_up_to_one": "The weights must add up to 1.",
    "expansion_not_monotone": "The Cornish-Fisher expansion with these parameters falls somewhere and gives no law.",
    "unknown_asset": "There is no such asset under `assets`.",
    "weight_limits_infeasible": "No weights within these limits add up to 1.",
    "no_mix_above_threshold": "No mix has an expected return above the threshold.",
    "no_admissible_mix": "No mix keeps the limit on missing the threshold.",
    "threshold_without_risk": "The threshold can be kept without any risk, so that no ratio is the greatest.",
    "probability_not_below_half": "The method is for probabilities below one half.",
    "model_not_available": "The method is not available for this return model.",
    "not_a_correlation_matrix": "Correlations must be symmetric, 1 on the diagonal, and without a negative eigenvalue.",
    "periods_do_not_fit": "A time of the plan is no whole number of the periods of its returns, whose law does not "
    "divide.",
    "no_such_flow": "The flow that is sought never comes before the horizon.",
    "no_event": "An event needs a bound.",
    "bounds_do_not_go_together": "These bounds cannot describe one event.",
    "bounds_crossed": "The lower bound lies above the upper one.",
}

CAUTIONS = {
    "model_not_forecast": "An estimate under the stated assumptions, not advice or a promise; real markets may do worse; "
    "the rules and the licensed practice of the place where it is shown come first.",
    "chance_not_size": "This says how often the floor is missed, not how far below it the money may end; read it with "
    "the average gap.",
    "longer_is_not_safer": "A longer period makes missing the floor rarer, but the worst results grow with it.",
    "gap_over_all_outcomes": "This average counts the good outcomes as zero; when the floor is missed, the average gap "
    "is the larger figure beside it.",
    "not_the_most_you_can_lose": "Losses larger than this do happen: in about one of so many periods, by its own "
    "definition.",
    "loss_from_today_only": "This looks at the end of the period only; on the way the value may stand lower.",
    "first_is_not_safe": "First means safer than the others in this list, not safe.",
    "ratio_and_probability_disagree": "By the ratio one portfolio leads, by the chance of missing the floor another; "
    "the chance is the figure to show.",
    "none_admissible": "No portfolio keeps the chance of missing the floor within the limit.",
    "leader_by_luck": "The leader was picked from the same data, so this share is too high, most of all when the "
    "candidates are much alike.",
    "independence_assumed": "The correlations of the portfolios are not given; their returns are taken as independent.",
    "estimates_taken_as_true": "Expected return and risk are taken as known; a return one point lower changes the "
    "answer.",
    "unusual_level": "A tail is usually the smaller part of all outcomes: levels above 0.5, probabilities below.",
    "optimum_is_optimistic": "The mix fits the estimates it was given, errors included; expect less from it than shown.",
    "law_is_approximation": "A mix of lognormal assets is taken as lognormal with the same mean and volatility.",
    "growth_below_zero": "A loss of more than everything is possible under this model; it counts as a loss of all, and is "
    "final.",
    "discrete_law_approximated": "There are too many possible outcomes to list; their law is taken as smooth, with the "
    "error stated.",
    "class_is_not_a_limit": "The class describes past ups and downs; a low class is neither free of risk nor a limit on losses.",
    "as_understood_here": "Computed by the published formula as understood here; whoever publishes the figure answers for it.",
    "short_history": "The history is short for such figures.",
    "formula_outside_its_range": "The formula is used outside the range that it is made for.",
    "mean_above_typical": "A few very good outcomes lift this average; more than half of all outcomes lie below it.",
    "bands_are_not_paths": "The lines join separate years; no single course of the money follows one of them.",
    "success_hides_size": "Missing the goal by a little and by everything count alike here; see the average gap and the "
    "chance of running out.",
    "same_spending_whatever_happens": "The plan is assumed to go on spending the same in bad years; people usually "
    "change course earlier.",
    "steady_inflation": "Prices are assumed to rise evenly; higher or uneven inflation lowers every figure in today's "
    "money.",
    "life_beyond_horizon": "The person may well live beyond the last year calculated; running out after it is not in "
    "this figure.",
    "success_jumps": "The chance of success jumps at this value; just beside it, it is on the other side of the wanted "
    "one.",
    "looks_like_percent": "A figure was perhaps meant in per cent: 5 for 0.05.",
}

NULL_REASONS = {
    "unattainable": "No value gives the wanted probability.",
    "other_standard": "The figure belongs to another standard.",
    "none_admissible": "No portfolio is admissible, so none leads.",
    "needs_shade": "The figure needs shade: the event to shade.",
    "no_rank": "The portfolio is not admissible, or the criterion has no value for it.",
    "needs_sample_size": "The figure needs sample_size: the periods behind the estimates.",
    "not_computed": "The figure is not computed for so many portfolios, or not asked for.",
    "positive_infinity": "The figure is plus infinity.",
    "negative_infinity": "The figure is minus infinity.",
    "beyond_horizon": "The probability is not reached by the horizon.",
    "needs_lifetime": "The figure needs lifetime or lives.",
    "no_value": "The figure has no value for this question.",
}

METHODS = {
    "closed_form": "From a formula, by elementary and special functions.",
    "saddle_point_and_quadrature": "Saddle-point density times a quadrature of the tail, in logarithms.",
    "newton_on_log_tail": "Newton's iteration on the logarithm of the tail.",
    "bisection_on_exact_tail": "A search between whole numbers on the exact tail.",
    "quadrature": "Numerical integration with a known error.",
    "closed_form_and_quadrature": "Probabilities and quantiles from a formula, averages by numerical integration.",
    "active_set_on_frontier": "An active-set walk along the efficient frontier; figures of the mix from a formula.",
    "regulation_formula": "The formula of a regulation.",
    "counting": "Observations counted; probabilities are exact fractions.",
    "enumeration": "All possible outcomes listed, each with its exact probability.",
    "exact_sum": "A sum over the components that may rule, each term from a formula.",
    "two_halves": "The outcomes of each half of the periods listed, and every pair of them counted by sorted search.",
    "fourier_inversion": "The characteristic function inverted numerically; two grids show the error.",
    "lognormal_mixture_quadrature": "Wealth between cash flows as a mixture of lognormal laws, by the trapezoidal rule; "
    "a coarser second run shows the error.",
    "lattice_fourier": "Wealth between cash flows on an even grid, growth by Fourier transform; a coarser second run "
    "shows the error.",
    "bracketed_root_of_outlook": "A bracketed search on the chance of success, each trial computed in full.",
    "several_methods": "The portfolios' laws are computed by different methods.",
    "batch": "Each answer of the batch names its own method.",
}


def require_listed(fault: str) -> None:
    """Raise LookupError for a fault code that clients could not look up."""
    if fault not in FAULTS:
        raise LookupError(f"the fault code {fault} is not listed in service.core.codes")
