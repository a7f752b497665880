"""What is drawn, leaks, is pumped or comes in, in words for the screen and the page."""

from __future__ import annotations

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.experiment.samples import Sample
from meanfree.report import wording


def sample_words(sample: Sample) -> str:
    """One sample: ``10 mL drawn at 10 min``."""
    at = wording.as_written(sample.at)
    if sample.fraction is not None:
        return f"{wording.percent(sample.fraction.value)} of the gas drawn at {at}"
    assert sample.volume is not None, "a sample is a fraction or a volume"
    return f"{wording.as_written(sample.volume)} of gas drawn at {at}"


def flow_words(flow: Flow, experiment: Experiment) -> str:
    """One flow: ``leak-up: 10 mtorr/min of 0.79 N₂ and 0.21 O₂ comes in``."""
    if flow.kind == "effusion":
        assert flow.hole is not None
        through = wording.as_written(flow.hole)
        if not flow.transmission.default:
            through += f" with transmission {wording.given(flow.transmission.value)}"
        return f"effusion: each gas leaves through {through}, into vacuum"
    if flow.kind == "leak-up":
        assert flow.rise is not None
        rise = wording.as_written(flow.rise)
        return f"leak-up: {rise} of {_entering(flow, experiment)} comes in"
    assert flow.rate is not None
    rate = wording.as_written(flow.rate)
    if flow.kind == "pumping":
        return f"pumping: all gases leave alike, {rate}"
    return (
        f"dilution: all gases leave alike, {rate}, and {_entering(flow, experiment)} replaces them"
    )


def _entering(flow: Flow, experiment: Experiment) -> str:
    shares = flow.entering or {}
    named = {name: wording.chemical(experiment.gas_named[name]) for name in shares}
    if len(shares) == 1:
        return next(iter(named.values()))
    return " and ".join(
        f"{wording.given(share.value)} {named[name]}" for name, share in shares.items()
    )
