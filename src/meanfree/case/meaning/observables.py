"""What a sweep asks of every run, out of words: "reaction time of NO to 90 %"."""

from __future__ import annotations

import re
from collections.abc import Sequence

from meanfree.case.findings import Findings, did_you_mean
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.observables import (
    QUANTITIES,
    At,
    EndTime,
    HalfLife,
    Observable,
    Peak,
    ReactionTime,
)
from meanfree.units import QuantityError, read, read_number
from meanfree.units.gate import quoted

_OF_GASES = [word for word, (name, _) in QUANTITIES.items() if "{}" in name]
_OF_ALL = [word for word in QUANTITIES if word not in _OF_GASES]
_REACTION_TIME = re.compile(r"reaction time of (\S+) to (.+)")
_HALF_LIFE = re.compile(r"(?:(\d{1,2})(?:st|nd|rd|th) )?half-life of (\S+)")
_PEAK = re.compile(r"peak of (\S+)")
_GAS_AT = re.compile(rf"({'|'.join(_OF_GASES)}) of (\S+)(?: at (.+))?")
_ALL_AT = re.compile(rf"({'|'.join(_OF_ALL)})(?: at (.+))?")
_LENGTH = "length of the run"
_EXPECTED = (
    '"reaction time of X to 0.9", "half-life of X", "peak of X", "length of the run", '
    f"{', '.join(chr(34) + word + ' of X' + chr(34) for word in _OF_GASES)}, "
    f"{', '.join(chr(34) + word + chr(34) for word in _OF_ALL)}, the last eight also with "
    '" at 10 min"'
)
_MOST = 200


def read_observables(
    texts: Sequence[str] | None, experiment: Experiment, key: str, findings: Findings
) -> tuple[Observable, ...]:
    """The observables that texts name; what is wrong goes to ``findings``."""
    if texts is None:
        return _usual(experiment)
    if not texts or len(texts) > _MOST:
        findings.wrong(key, f"{len(texts) or 'none'}", f"from 1 to {_MOST} observables")
        return ()
    found: list[Observable] = []
    columns: dict[str, str] = {}
    for place, text in enumerate(texts):
        one = _read(" ".join(text.split()), experiment, f"{key}.{place}", findings)
        if one is None:
            continue
        for column in one.columns:
            if column in columns:
                findings.wrong(f"{key}.{place}", f"{quoted(text)} a second time", "each once")
                break
            columns[column] = text
        else:
            found.append(one)
    return tuple(found)


def _usual(experiment: Experiment) -> tuple[Observable, ...]:
    gas = experiment.watched
    of_gas: tuple[Observable, ...] = ()
    if gas is not None:
        of_gas = (HalfLife(gas), At("conversion", gas))
    return (*of_gas, At("total pressure"), EndTime())


def _read(text: str, experiment: Experiment, key: str, findings: Findings) -> Observable | None:
    if text == _LENGTH:
        return EndTime()
    if found := _REACTION_TIME.fullmatch(text):
        conversion = _conversion(found[2], key, findings)
        gas = _gas(found[1], experiment, key, findings, filled=True)
        return ReactionTime(gas, conversion) if gas and conversion else None
    if found := _HALF_LIFE.fullmatch(text):
        ordinal = int(found[1] or 1)
        if not 1 <= ordinal <= 30:
            findings.wrong(key, quoted(text), "a half-life from the 1st to the 30th")
            return None
        gas = _gas(found[2], experiment, key, findings, filled=True)
        return HalfLife(gas, ordinal) if gas else None
    if found := _PEAK.fullmatch(text):
        gas = _gas(found[1], experiment, key, findings)
        return Peak(gas) if gas else None
    if found := _GAS_AT.fullmatch(text):
        time, right = _time(found[3], key, findings)
        gas = _gas(found[2], experiment, key, findings, filled=found[1] == "conversion")
        return At(found[1], gas, time) if gas and right else None
    if found := _ALL_AT.fullmatch(text):
        time, right = _time(found[2], key, findings)
        return At(found[1], time=time) if right else None
    findings.wrong(key, quoted(text), f"one of {_EXPECTED}")
    return None


def _gas(
    name: str, experiment: Experiment, key: str, findings: Findings, *, filled: bool = False
) -> str:
    moles = experiment.moles
    names = [g for g in experiment.gas_named if not filled or moles.get(g, 0) > 0]
    if name in names:
        return name
    kind = "a filled gas" if filled else "a gas of the case"
    expected = f"{kind}: one of {', '.join(names)}{did_you_mean(name, names)}"
    findings.wrong(key, quoted(name), expected)
    return ""


def _conversion(text: str, key: str, findings: Findings) -> float | None:
    try:
        number = read_number(_plain(text), "fraction").value
    except QuantityError as error:
        findings.refused(key, error)
        return None
    if not 0 < number < 1:
        findings.wrong(key, quoted(text), "a conversion between 0 and 1")
        return None
    return number


def _plain(text: str) -> str | float:
    try:
        return float(text)
    except ValueError:
        return text


def _time(text: str | None, key: str, findings: Findings) -> tuple[float | None, bool]:
    """(time [s] or None for the end, whether it is right)."""
    if text is None or text == "the end":
        return None, True
    try:
        time = read(text, "time").value
    except QuantityError as error:
        findings.refused(key, error)
        return None, False
    if time <= 0:
        findings.wrong(key, quoted(text), "a time above 0 s")
        return None, False
    return time, True
