"""Cautions that stand both in an audit's list and, on pages, beside what they are about."""

from coverage_lab.records import Side
from coverage_lab.rounding import percent

CONDITIONAL = (
    "Every figure is conditional on the planned range and on the sampling model; none says anything about bias: who "
    "was not reached, what was misclassified, what was lost."
)
OF_ZERO = (
    "Zero events is not zero risk: it leaves every proportion up to the upper limit open. Do not switch to a "
    "one-sided bound because the count came out as zero; the side is part of the plan."
)
OF_SIMULATION = (
    "A simulated minimum over many proportions is biased low, since it picks the unluckiest cell; exact minima are "
    "stated where they could be computed."
)


def of_side(confidence: float, alpha: float, side: Side) -> str:
    """What the confidence means beside that of the other kind, one-sided or two-sided."""
    bound = f"A one-sided {percent(confidence)} bound"
    matching = f" is the matching limit of a two-sided {percent(1 - 2 * alpha)} interval" if alpha < 0.5 else ""
    if side != "two-sided":
        joint = " and" if matching else ""
        return (
            f"{bound}{matching}{joint} spends all of its error on one side; confirmatory work often asks for 2.5 % on "
            "that side."
        )
    other = f"{bound}{matching}; confirmatory" if matching else "Confirmatory"
    return (
        f"Each limit of a two-sided {percent(confidence)} interval is a one-sided {percent(1 - alpha / 2)} bound. "
        f"{other} work often asks for 2.5 % on the side that decides."
    )
