"""The answers and tables of `ceiling`: rows of text for the screen and the page, CSV in SI."""

from __future__ import annotations

from meanfree import units
from meanfree.planning.ceiling import CeilingTable, Level, StepCeiling
from meanfree.rates.attraction import Attraction
from meanfree.report import wording
from meanfree.report.ceiling.models import CeilingSummary
from meanfree.report.ceiling.naming import (
    DEFAULT_UNIT,
    ORDER,
    crossings,
    kelvins,
    reaction,
    unit_of,
)
from meanfree.report.rows import NONE, Answer, Row, Sheet
from meanfree.report.tables import to_csv

LISTED = 8
"""Encounters answered one by one; the tables have them all."""


def answers(table: CeilingTable) -> list[Answer]:
    """The verdict of each encounter at the run's temperature, the suspect ones first."""
    if not table.steps:
        return [Answer("Ceiling", "none", "no step is an encounter with a known ceiling")]
    ordered = sorted(table.steps, key=lambda one: not _suspect(one))
    found = [_answer(one) for one in ordered[:LISTED]]
    if len(ordered) > LISTED:
        found.append(Answer("and", f"{len(ordered) - LISTED} more", "in the table"))
    return found


def _suspect(one: StepCeiling) -> bool:
    return any(level.standing.may_be_wrong for level in one.levels)


def _answer(one: StepCeiling) -> Answer:
    level = one.at_run
    said = level.standing.value
    others = dict.fromkeys(
        f"{other.standing.value} at {wording.temperature(other.temperature)}"
        for other in one.levels
        if other.standing is not level.standing and other.standing.may_be_wrong
    )
    name = "Z" if level.limit is not None else "long-range capture"
    ceiling = level.ceiling if level.limit is None else level.limit.Z
    share = f"{wording.number(level.k / ceiling)} of {name}"
    note = f"at {wording.temperature(level.temperature)}, {share}"
    crossed = [crossings(one)] if one.crossings else []
    note = "; ".join([note, *others, *crossed])
    return Answer(wording.clean(one.name), said, note)


def levels_sheet(table: CeilingTable) -> Sheet:
    """k, its ceilings and the verdict at each temperature of each encounter."""
    far = any(level.long_range is not None for one in table.steps for level in one.levels)
    heading = ["Step", "T", "Verdict", "k", "Z", *(["Long range"] if far else []), "k over Z"]
    rows = [_level_row(one, level, far) for one in table.steps for level in one.levels]
    return Sheet(heading, rows, words=(0, 2))


def _level_row(one: StepCeiling, level: Level, far: bool) -> Row:
    limit, unit = level.limit, unit_of(one)
    row = [wording.clean(one.name), wording.temperature(level.temperature), _verdict(level)]
    row += [f"{_in(level.k, unit, 4)} {wording.pretty_unit(unit)}"]
    row += [NONE if limit is None else _in(limit.Z, unit, 4)]
    if far:
        row += [NONE if level.long_range is None else _in(level.long_range, unit, 4)]
    return [*row, NONE if limit is None else wording.number(level.k / limit.Z)]


def factors_sheet(table: CeilingTable) -> Sheet:
    """Ea and its threshold, P and A over Z, each at the temperature it holds at."""
    rows: list[Row] = []
    for one in table.steps:
        for level in one.levels:
            judged = level.judgement
            row = [wording.clean(one.name), wording.temperature(level.temperature)]
            row += [
                _kilojoules(level.Ea),
                _kilojoules(None if judged is None else judged.threshold),
            ]
            row += [_plain(None if judged is None else judged.steric)]
            rows.append([*row, _plain(None if judged is None else judged.A_over_Z)])
    heading = ["Step", "T", "Ea (kJ/mol)", "E0 (kJ/mol)", "Steric factor P", "A over Z"]
    return Sheet(heading, rows)


def _verdict(level: Level) -> str:
    said = [level.standing.value]
    if level.judgement is not None and level.judgement.below_half_rt:
        said.append("Ea is below RT/2, so E0 = 0")
    if level.Ea is not None and level.Ea < 0 and abs(level.Ea) > 1e-3:
        said.append("k falls as it gets hotter")
    if level.outside:
        said.append("outside the range that the step states")
    return "; ".join(said)


def _kilojoules(value: float | None) -> str:
    # Ea is a difference of five k: a thousandth of a joule is rounding.
    if value is None:
        return NONE
    return wording.number(0.0 if abs(value) < 1e-3 else value / 1e3, 4)


def _plain(value: float | None) -> str:
    return NONE if value is None else wording.number(value)


def ranges_sheet(table: CeilingTable) -> Sheet:
    """Over what each encounter was looked at and why, and where it crosses a ceiling."""
    rows = [
        [
            wording.clean(one.name),
            kelvins(one.span),
            wording.clean(one.span_basis),
            crossings(one),
        ]
        for one in table.steps
    ]
    heading = ["Step", "Range", "Because it is", "k is above its ceiling"]
    return Sheet(heading, rows, words=(0, 1, 2, 3))


def pairs_sheet(table: CeilingTable) -> Sheet:
    """The reaction, the diameter of the pair, and what attracts the two."""
    rows: list[Row] = []
    for one in table.steps:
        pull, limit = one.attraction, one.levels[0].limit
        far = f"{pull.word}, {pull.basis}" if isinstance(pull, Attraction) else pull
        diameter = NONE if limit is None else f"{wording.number(limit.pair_diameter * 1e10, 4)} Å"
        printed = wording.reaction(reaction(one), table.experiment)
        rows.append([wording.clean(one.name), printed, diameter, wording.clean(far)])
    heading = ["Step", "Reaction", "Pair diameter", "Long-range attraction"]
    return Sheet(heading, rows, words=(0, 1, 3))


def left_out_sheet(table: CeilingTable) -> Sheet | None:
    """The steps that have no ceiling, and why; None where all have one."""
    rows = [[wording.clean(one.name), wording.clean(one.why)] for one in table.left_out]
    return Sheet(["Step", "No ceiling because"], rows, words=(0, 1)) if rows else None


def screen_sheet(table: CeilingTable) -> Sheet | None:
    """The same in few narrow columns, at the run's temperature; None where there is nothing."""
    if not table.steps:
        return None
    written = {unit_of(one) for one in table.steps}
    unit = written.pop() if len(written) == 1 else DEFAULT_UNIT
    rows = []
    for one in table.steps:
        level = one.at_run
        judged, limit = level.judgement, level.limit
        rows.append(
            [
                _cut(wording.clean(one.name)),
                wording.temperature(level.temperature),
                _in(level.k, unit, 3),
                NONE if limit is None else _in(limit.Z, unit, 3),
                _plain(None if judged is None else judged.steric),
                _plain(None if judged is None else judged.A_over_Z),
            ]
        )
    heading = ["Step", "T", f"k, {wording.pretty_unit(unit)}", "Z, the same", "P", "A over Z"]
    return Sheet(heading, rows, words=(0,))


def _cut(name: str, longest: int = 27) -> str:
    return name if len(name) <= longest else name[: longest - 1] + "…"


def _in(value: float, unit: str, digits: int) -> str:
    """A rate constant of second order in a unit, without it."""
    return wording.number(units.from_si(value, unit, units.rate_constant(ORDER)), digits)


def ceiling_csv(summary: CeilingSummary) -> str:
    """One row for each encounter and temperature, SI."""
    keys = (
        *("T_K", "k_m3_per_mol_s", "Z_m3_per_mol_s", "long_range_m3_per_mol_s", "k_over_Z"),
        *("Ea_J_per_mol", "E0_J_per_mol", "steric_factor", "A_over_Z", "verdict"),
    )
    rows = [
        (one.step, one.reaction, one.law, *(getattr(level, key) for key in keys))
        for one in summary.encounters
        for level in one.levels
    ]
    return to_csv(("step", "reaction", "law", *keys), rows)


def curves_csv(table: CeilingTable) -> str:
    """What the figure draws, SI."""
    header = ("step", "T_K", "k_m3_per_mol_s", "Z_m3_per_mol_s", "long_range_m3_per_mol_s")
    rows = []
    for one in table.steps:
        curve = one.curve
        for i, T in enumerate(curve.temperatures):
            Z = None if curve.Z is None else float(curve.Z[i])
            far = None if curve.long_range is None else float(curve.long_range[i])
            rows.append((one.name, float(T), float(curve.k[i]), Z, far))
    return to_csv(header, rows)


def crossings_csv(summary: CeilingSummary) -> str:
    """Where k equals a ceiling."""
    return to_csv(
        ("step", "T_K", "ceiling", "k_rises_above", "inside_range"),
        [
            (one.step, at.T_K, at.ceiling, _yes(at.k_rises_above), _yes(at.inside_range))
            for one in summary.encounters
            for at in one.crossings
        ],
    )


def _yes(value: bool) -> str:
    return str(value).lower()
