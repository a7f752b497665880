"""Why no value in a range reaches a goal, in one sentence."""

from __future__ import annotations

from meanfree.experiment.experiment import Experiment
from meanfree.planning.sizing import Sizing
from meanfree.planning.why_not import Reason
from meanfree.report import wording
from meanfree.report.planning.naming import at_address


def because(reason: Reason, sizing: Sizing, experiment: Experiment) -> str:
    """The sentence, beginning with the end of the range that comes nearest."""
    at = at_address(reason.at, sizing.address, experiment)
    gas = _gas(sizing.goal.gas, experiment)
    fraction = sizing.goal.kind == "conversion"

    def level(value: float) -> str:
        return wording.percent(value) if fraction else wording.number(value)

    within = wording.duration(sizing.within)
    if reason.why == "reached sooner":
        time = wording.duration(reason.time)
        return f"reached sooner in the whole range; nearest at {at}, after {time}"
    text = f"nearest at {at}: {level(reason.most)} within {within}"
    if reason.why == "equilibrium":
        return f"{text}; equilibrium stops it at {level(reason.eventually)}"
    if reason.why == "another gas":
        other = _gas(reason.named, experiment)
        return f"{text}; {other} runs out first, and {gas} stops at {level(reason.eventually)}"
    if reason.why == "another step":
        by = f" by {wording.clean(reason.named)}" if reason.named else ""
        verb = "is kept from going further" if fraction else "is taken"
        return f"{text}; {gas} {verb}{by}, and comes to {level(reason.eventually)} at most"
    after = wording.duration(reason.time)
    if reason.why == "limit of collisions":
        fastest = wording.duration(reason.at_limit)
        return (
            f"{text}; it takes {after} there, and {fastest} even if every encounter reacted: "
            "the limit of collisions"
        )
    text += f"; it takes {after} there"
    if reason.at_limit is not None:
        text += f" ({wording.duration(reason.at_limit)} if every encounter reacted)"
    return text


def _gas(name: str, experiment: Experiment) -> str:
    known = experiment.gas_named.get(name)
    return wording.clean(name) if known is None else wording.chemical(known)
