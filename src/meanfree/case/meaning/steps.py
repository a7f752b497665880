"""``[[steps]]``: reactions, orders, what k counts, balance, and the law of each step."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from meanfree.case.findings import Findings, did_you_mean, nearest, one_of
from meanfree.case.laws.registry import LAW_SHAPES
from meanfree.case.meaning.names import step_name_problem
from meanfree.case.meaning.reaction import Reaction, ReactionError, imbalance, parse_reaction
from meanfree.case.meaning.reverse import read_reverse
from meanfree.case.schema.base import shape
from meanfree.case.schema.steps import StepTable, UnknownLawStep
from meanfree.case.step_reading import StepReading
from meanfree.experiment.mechanism import Bath, Step, Uncertainty
from meanfree.experiment.temperature import Temperature, has_energy_balance
from meanfree.gases.gas import Gas
from meanfree.units.gate import quoted
from meanfree.units.reading import described

MOST = 20_000


@dataclass(frozen=True)
class Written:
    """A step before its gases are known: its address, its table, its reaction if readable."""

    address: str
    table: StepTable
    reaction: Reaction | None
    raw_reverse: Any


def read_written(raw: Any, findings: Findings) -> list[Written]:
    """The steps as written; what is wrong with their shape or text is a problem."""
    if raw is None or raw == []:
        findings.wrong(
            "steps", "nothing", "at least one table [[steps]] with name, reaction and law"
        )
        return []
    if not isinstance(raw, list):
        single = isinstance(raw, dict)
        found = "a table [steps]" if single else described(raw)
        findings.wrong("steps", found, "tables headed [[steps]], with two brackets")
        return []
    if len(raw) > MOST:
        findings.wrong("steps", f"{len(raw)} steps", f"at most {MOST} steps")
        return []
    written: list[Written] = []
    names: set[str] = set()
    for place, table in enumerate(raw):
        step = _written_step(place, table, names, findings)
        if step is not None:
            written.append(step)
    return written


def _written_step(place: int, raw: Any, names: set[str], findings: Findings) -> Written | None:
    name = raw.get("name") if isinstance(raw, dict) else None
    address = f"steps.{place}"
    if isinstance(name, str) and name.strip():
        problem = step_name_problem(name.strip())
        if problem is not None:
            findings.wrong(f"{address}.name", *problem)
        else:
            address = f"steps.{name.strip()}"
            if name.strip() in names:
                found = f'a second step named "{name.strip()}"'
                findings.wrong(f"{address}.name", found, "a name of its own for each step")
            names.add(name.strip())
    law = _law_word(raw, address, findings)
    if law is not None:
        raw = {**raw, "law": law}
    table = shape(LAW_SHAPES.get(law or "", UnknownLawStep), raw, address, findings)
    if table is None:
        return None
    reaction = None
    if table.reaction is not None:
        try:
            reaction = parse_reaction(
                table.reaction,
                from_nothing=table.may_come_from_nothing,
                to_nothing=table.may_go_to_nothing,
            )
        except ReactionError as error:
            for found, expected in error.problems:
                findings.wrong(f"{address}.reaction", found, expected)
    return Written(address, table, reaction, table.reverse)


def _law_word(raw: Any, address: str, findings: Findings) -> str | None:
    """The law's word; of a misspelt one the word that was meant, for the other keys' sake."""
    law = raw.get("law") if isinstance(raw, dict) else None
    if law is None or (isinstance(law, str) and law in LAW_SHAPES):
        return law
    near = nearest(law, LAW_SHAPES) if isinstance(law, str) else ""
    hint = f' (did you mean "{near}"?)' if near else ""
    findings.wrong(f"{address}.law", described(law), one_of(LAW_SHAPES) + hint)
    return near or None


def read_step(
    written: Written,
    gases: Mapping[str, Gas | None],
    temperature: Temperature | None,
    findings: Findings,
) -> Step | None:
    """One step with its law, None where something is wrong with it."""
    before = len(findings.problems)
    table, reaction = written.table, written.reaction
    reading = StepReading(written.address, table, findings, gases, temperature, reaction)
    _check_balance(reading)
    reading.orders = _orders(reading)
    reading.per = _per(reading)
    law = table.to_law(reading)
    reverse = read_reverse(written.raw_reverse, reading)
    bath = _bath(reading)
    _check_heat(reading)
    _check_valid(reading)
    if len(findings.problems) > before or reaction is None or law is None or table._wrong:
        return None
    assert reading.orders is not None
    sure = table.uncertainty
    return Step(
        name=table.name,
        reactants=reaction.reactants,
        products=reaction.products,
        law=law,
        stated_orders=None if table.orders is None else tuple(reading.orders.items()),
        bath=bath,
        reverse=reverse,
        counts=table.k_counts,
        heat=None if table.heat is None else reading.sourced(table.heat),
        photon=None if table.photon is None else reading.sourced(table.photon),
        uncertainty=None if sure is None else Uncertainty(sure.factor.value, sure.sigmas.value),
        source=table.source,
        valid=table.valid,
    )


def _check_balance(reading: StepReading) -> None:
    """Elements and charge, where every gas of the step is a real one that is known.

    A step that brings or takes gas has nothing to balance.
    """
    if reading.reaction is None or not (reading.reaction.reactants and reading.reaction.products):
        return
    found = {name: reading.gases.get(name) for name in reading.reaction.gases}
    formulas = {name: gas.formula for name, gas in found.items() if gas and gas.formula is not None}
    if len(formulas) < len(found):
        return
    wrong = list(imbalance(reading.reaction, formulas))
    if wrong:
        each = "; ".join(f"{what}: {a:g} on the left, {b:g} on the right" for what, a, b in wrong)
        shown = quoted(reading.table.reaction)
        reading.wrong("reaction", f"{shown} ({each})", "the same atoms and charge on both sides")


def _orders(reading: StepReading) -> dict[str, float] | None:
    """The order in each gas, without M."""
    reaction, stated = reading.reaction, reading.table.orders
    if reaction is None or reading.table.is_wrong("orders"):
        return None
    if stated is None:
        broken = [f"{n:g} {gas}" for gas, n in reaction.reactants if not float(n).is_integer()]
        if broken:
            found = f"nothing, though {', '.join(broken)} stands on the left"
            reading.wrong("orders", found, "orders = { … } that say the order in each gas")
            return None
        return dict(reaction.reactants)
    before = reading.count
    for gas in stated:
        if gas not in reading.gases:
            expected = "gases of the case" + did_you_mean(gas, reading.gases)
            reading.wrong(f"orders.{gas}", "a gas that is not in the case", expected)
    for gas, _ in reaction.reactants:
        if gas not in stated:
            found = f"orders without {gas}, which is on the left"
            reading.wrong("orders", found, f"an order for every reactant; {gas} = 0 is allowed")
    if reading.count > before:
        return None
    return {gas: order.value for gas, order in stated.items()}


def _per(reading: StepReading) -> float | None:
    """Counted molecules per event: |net number| of the gas that k_counts names, else 1."""
    counts = reading.table.k_counts
    if counts == "events" or counts is None:
        return 1.0
    verb, _, gas = counts.partition(" of ")
    if verb not in ("loss", "formation") or not gas:
        expected = '"events", "loss of A" or "formation of X" with a gas of the step'
        reading.wrong("k_counts", quoted(counts), expected)
        return None
    if reading.reaction is None:
        return None
    net = reading.reaction.net.get(gas)
    if net is None:
        near = did_you_mean(gas, reading.reaction.gases)
        reading.wrong("k_counts", quoted(counts), f"a gas of the step{near}")
    elif net == 0:
        found = f"{quoted(counts)}, of which the step changes nothing"
        reading.wrong("k_counts", found, "a gas that the step uses up or forms")
    elif (net < 0) != (verb == "loss"):
        right = "loss" if net < 0 else "formation"
        reading.wrong("k_counts", quoted(counts), f'"{right} of {gas}"')
    else:
        return abs(net)
    return None


def _bath(reading: StepReading) -> Bath | None:
    partners = reading.table.partners
    if reading.reaction is None:
        return None
    if not reading.reaction.bath:
        if partners is not None:
            expected = 'the bath partner "+ M" in the reaction, or no partners'
            reading.wrong("partners", "bath partners of a step without M", expected)
        return None
    efficiencies = {gas: factor.value for gas, factor in (partners or {}).items()}
    others = efficiencies.pop("others", 1.0)
    for gas in efficiencies:
        if gas not in reading.gases:
            expected = "gases of the case, or others" + did_you_mean(gas, reading.gases)
            reading.wrong(f"partners.{gas}", "a gas that is not in the case", expected)
    return Bath(efficiencies, others)


def _check_heat(reading: StepReading) -> None:
    """With an energy balance, steps of labels must state their heat and light its energy.

    Heat and photon together could mean that the light is counted once or twice. A step that brings
    or takes gas has no heat of its own.
    """
    temperature, reaction, table = reading.temperature, reading.reaction, reading.table
    if table.has("heat") and table.has("photon"):
        expected = "one of them: heat is all that one mole of events leaves behind, light included"
        reading.wrong("heat", "both heat and photon", expected)
        return
    if reaction is not None and not (reaction.reactants and reaction.products):
        if table.has("heat"):
            expected = "no heat: what comes and goes carries the energy of the gas, and no other"
            reading.wrong("heat", "heat of a step that brings or takes gas", expected)
        return
    if temperature is None or reaction is None or not has_energy_balance(temperature):
        return
    if table.has("heat"):
        return
    labels = [name for name in reaction.gases if (gas := reading.gases.get(name)) and gas.is_label]
    if labels:
        found = f"nothing, though the temperature follows the energy and {labels[0]} is a label"
        expected = 'the heat that the step releases, such as heat = "180 kJ/mol"'
        reading.wrong("heat", found, expected)
    elif table.needs_light and not table.has("photon"):
        found = "nothing, though the temperature follows the energy and light drives the step"
        expected = 'what one event takes in, such as photon = "365 nm"; or heat, light included'
        reading.wrong("photon", found, expected)


def _check_valid(reading: StepReading) -> None:
    valid = reading.table.valid
    if valid is None:
        return
    low, high = (T.value for T in valid)
    if low >= high:
        reading.wrong("valid", f"{low:g} to {high:g} K", "a lower and a higher temperature")
        return
    if reading.temperature is None:
        return
    from meanfree.case.meaning.temperature import span

    first, last = span(reading.temperature)
    if first < low or last > high:
        used = f"{first:g} K" if first == last else f"{first:g} to {last:g} K"
        reading.findings.note(
            f"{reading.address}: found from {low:g} to {high:g} K, the law is used at {used}."
        )
