"""Addresses in words, and values at an address with their unit."""

from __future__ import annotations

import re

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.report import wording

_PLAIN = {
    "temperature.value": "temperature",
    "temperature.surroundings": "temperature of the surroundings",
    "temperature.conductance": "conductance",
    "temperature.wall_heat_capacity": "heat capacity of the wall",
    "vessel.volume": "volume",
    "vessel.pressure": "pressure held",
    "fill.total": "total filled",
    "fill.at": "filling temperature",
    "run.until": "length of the run",
}


def in_words(address: str, experiment: Experiment) -> str:
    """What an address means: ``temperature``, ``NOCl filled``, ``Ea of decomposition``."""
    if address in _PLAIN:
        return _PLAIN[address]
    words = address.split(".")
    if address.startswith("fill.gases."):
        return f"{_gas(words[2], experiment)} filled"
    if address.startswith("gases."):
        name, _, key = address.removeprefix("gases.").rpartition(".")
        return f"{wording.clean(key.replace('_', ' '))} of {_gas(name, experiment)}"
    if address.startswith("steps."):
        step = next((s for s in experiment.steps if address.startswith(f"steps.{s.name}.")), None)
        if step is not None:
            key = address.removeprefix(f"steps.{step.name}.")
            return f"{wording.clean(key)} of {wording.clean(step.name)}"
    return wording.clean(address)


def _gas(name: str, experiment: Experiment) -> str:
    known = experiment.gas_named.get(name)
    return wording.clean(name) if known is None else wording.chemical(known)


def with_formulas(text: str, experiment: Experiment) -> str:
    """A sentence in which gases are printed as formulas: NO2 as NO₂."""

    def printed(word: re.Match[str]) -> str:
        known = experiment.gas_named.get(word[0])
        return word[0] if known is None else wording.chemical(known)

    return re.sub(r"[^\s,;:.]+", printed, text)


def at_address(value: float, address: str, experiment: Experiment, digits: int = 5) -> str:
    """A value in the unit of the file: ``486.73 K``."""
    known = inputs(experiment)[address]
    unit = wording.pretty_unit(known.unit)
    return f"{wording.number(value, digits)} {unit}".strip()


def axis_label(address: str, experiment: Experiment) -> str:
    """What stands along an axis: ``Temperature (K)``."""
    words = in_words(address, experiment)
    unit = wording.pretty_unit(inputs(experiment)[address].unit)
    name = words[:1].upper() + words[1:] if words in _PLAIN.values() else words
    return f"{name} ({unit})" if unit else name
