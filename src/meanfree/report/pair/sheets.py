"""The answers and tables about two gases, in units of the trade: for the screen and the page."""

from __future__ import annotations

from meanfree.report import wording
from meanfree.report.pair.cautions import half_in_words
from meanfree.report.pair.question import PairQuestion
from meanfree.report.pair.summary import CollideSummary, PartnerAnswer
from meanfree.report.rows import Answer, Row, Sheet
from meanfree.sourced import Sourced

_LENGTHS = ((1.0, 1.0, "m"), (1e-3, 1e-3, "mm"), (1e-7, 1e-6, "µm"), (0.0, 1e-9, "nm"))


def title(question: PairQuestion) -> str:
    """``H₂ + I₂ at 700 K``, with "on a surface" where it is one."""
    names = " + ".join(wording.chemical(gas) for gas in question.gases)
    where = " on a surface" if question.in_plane else ""
    return f"{names}{where} at {wording.temperature(question.temperature.value)}"


def answers(question: PairQuestion, summary: CollideSummary) -> tuple[Answer, ...]:
    """The ceiling, the rate constant where a threshold is given, and what they count."""
    found = [Answer("Ceiling Z", _both(summary, "Z"), "if every encounter reacted")]
    if question.has_threshold:
        found.append(Answer("Rate constant k", _both(summary, "k"), _barrier(question, summary)))
    found.append(Answer("Counting", half_in_words(question)))
    return tuple(found)


def _both(summary: CollideSummary, name: str) -> str:
    """Z or k by the mole and by the molecule."""
    molar, single = (
        ("m2_per_mol_s", "cm2_per_molecule_s")
        if summary.in_plane
        else ("L_per_mol_s", "cm3_per_molecule_s")
    )
    words = []
    for key in (molar, single):
        value = getattr(summary, f"{name}_{key}")
        unit = key.removesuffix("_s").replace("_per_", "/") + "/s"
        words.append(f"{_count(value)} {unit.translate(str.maketrans('23', '²³'))}")
    return " = ".join(words)


def _count(value: float) -> str:
    # exp(-E0/RT) leaves the numbers that a computer holds at E0 = 745 RT.
    return "less than 10⁻³⁰⁰" if value < 1e-300 else wording.number(value, 4)


def _barrier(question: PairQuestion, summary: CollideSummary) -> str:
    assert summary.E0_J_per_mol is not None and summary.Ea_J_per_mol is not None
    asked = question.threshold or question.activation_energy
    unit = asked.unit if asked is not None else "kJ/mol"
    barrier = wording.quantity(summary.E0_J_per_mol, unit, "molar energy", 4)
    slope = wording.quantity(summary.Ea_J_per_mol, unit, "molar energy", 4)
    return f"if those above E0 = {barrier} react; Ea = {slope}"


def pair_sheet(question: PairQuestion, summary: CollideSummary) -> Sheet:
    """What belongs to the two together."""
    rows: list[Row] = []

    def row(name: str, text: str, remark: str = "") -> None:
        rows.append([name, text, remark])

    row("Mean relative speed", f"{wording.number(summary.mean_relative_speed_m_per_s, 4)} m/s")
    row(
        "Reduced mass",
        f"{wording.number(1e3 * summary.reduced_molar_mass_kg_per_mol, 5)} g/mol",
        f"{wording.number(summary.reduced_mass_kg, 4)} kg",
    )
    row("Distance at contact", _angstrom(summary.pair_diameter_m), "(d₁ + d₂)/2")
    if summary.cross_section_m2 is not None:
        area = wording.number(summary.cross_section_m2 * 1e18, 4)
        square = wording.number(summary.cross_section_m2, 4)
        row("Cross-section σ", f"{area} nm²", f"{square} m²")
    if summary.swept_width_m is not None:
        row("Swept width", _angstrom(summary.swept_width_m), "d₁ + d₂")
    if summary.fraction_above_E0 is not None:
        row("Above the threshold", _count(summary.fraction_above_E0), "share of the encounters")
    density = summary.collision_density_per_m3_s
    if density is not None:
        molar = summary.collision_density_mol_per_m3_s or 0.0
        row(
            "Collision density",
            f"{wording.number(density, 4)} 1/m³/s",
            f"{wording.number(molar, 4)} mol/m³/s",
        )
    density = summary.collision_density_per_m2_s
    if density is not None:
        molar = summary.collision_density_mol_per_m2_s or 0.0
        row(
            "Collision density",
            f"{wording.number(density, 4)} 1/m²/s",
            f"{wording.number(molar, 4)} mol/m²/s",
        )
    return Sheet(["The pair", "", ""], rows, words=(0, 2))


def gases_sheet(question: PairQuestion, summary: CollideSummary) -> Sheet:
    """What belongs to each gas, a column each; without the frequencies where nothing is filled."""
    names = [wording.chemical(gas) for gas in question.gases[: len(summary.gases)]]
    rows = [
        ["Mean speed", *(_speed(g.mean_speed_m_per_s) for g in summary.gases)],
        [
            "Root-mean-square speed",
            *(_speed(g.root_mean_square_speed_m_per_s) for g in summary.gases),
        ],
        ["Most probable speed", *(_speed(g.most_probable_speed_m_per_s) for g in summary.gases)],
    ]
    if summary.filled_fraction is not None:
        rows += _crowd_rows(summary)
    return Sheet(["", *names], rows)


def _crowd_rows(summary: CollideSummary) -> list[Row]:
    gases = summary.gases
    rows: list[Row] = []
    if not summary.like_partners:
        rows.append(["Mole fraction", *(wording.given(g.mole_fraction or 0.0) for g in gases)])
    rows.append(["Concentration", *(_concentration(g) for g in gases)])
    rows.append(["Number density", *(_density(g) for g in gases)])
    rows.append(["Collision frequency", *(_rate(g.collisions_with_any_per_s) for g in gases)])
    if not summary.like_partners:
        partners = [_rate(g.collisions_with_partner_per_s) for g in gases]
        rows.append(["of these with the other gas", *partners])
    rows.append(["Mean free path", *(length(g.mean_free_path_m or 0.0) for g in gases)])
    return rows


def amount_in_words(question: PairQuestion) -> str:
    """How much gas the frequencies and free paths are for."""
    amount = question.coverage if question.in_plane else question.pressure
    if amount is None:
        return "Each gas by itself"
    mixture = "" if question.same_gas else " of both together"
    return f"Each gas, at {wording.as_written(amount)}{mixture}"


def sources_sheet(question: PairQuestion, summary: CollideSummary) -> Sheet:
    """Every constant that went in, with its source."""
    rows: list[Row] = []
    for gas, answer in zip(question.gases, summary.gases, strict=False):
        name = wording.chemical(gas)
        mass = f"{wording.given(1e3 * answer.molar_mass_kg_per_mol)} g/mol"
        rows.append([f"Molar mass of {name}", mass, answer.molar_mass_source])
        diameter = _angstrom(answer.diameter_m, 5)
        rows.append([f"Diameter of {name}", diameter, answer.diameter_source])
    for label, value in _conditions(question):
        rows.append([label, wording.as_written(value), value.source])
    for constant in summary.constants:
        number = wording.number(constant.value, 9)
        rows.append([constant.name, f"{number} {constant.unit}", constant.source])
    return Sheet(["What went in", "value", "source"], rows, words=(0, 2))


def _conditions(question: PairQuestion) -> list[tuple[str, Sourced]]:
    labelled = (
        ("Temperature", question.temperature),
        ("Pressure of both", question.pressure),
        ("Coverage by both", question.coverage),
        ("Threshold E0", question.threshold),
        ("Activation energy Ea", question.activation_energy),
    )
    return [(label, value) for label, value in labelled if value is not None]


def length(metre: float) -> str:
    """A length in the unit that needs no power of ten.

    >>> length(6.98e-8), length(2.3e-6), length(0.0705)
    ('69.8 nm', '2.3 µm', '70.5 mm')
    """
    unit = next((scale, name) for least, scale, name in _LENGTHS if metre >= least)
    return f"{wording.given(metre / unit[0], 4)} {unit[1]}"


def _speed(value: float) -> str:
    return f"{wording.number(value, 4)} m/s"


def _rate(value: float | None) -> str:
    return f"{wording.number(value or 0.0, 4)} 1/s"


def _angstrom(value: float, digits: int = 4) -> str:
    return f"{wording.given(value * 1e10, digits)} Å"


def _concentration(gas: PartnerAnswer) -> str:
    if gas.concentration_mol_per_m2 is not None:
        return f"{wording.number(gas.concentration_mol_per_m2, 4)} mol/m²"
    return f"{wording.number(gas.concentration_mol_per_m3 or 0.0, 4)} mol/m³"


def _density(gas: PartnerAnswer) -> str:
    if gas.number_density_per_m2 is not None:
        return f"{wording.number(1e-4 * gas.number_density_per_m2, 4)} 1/cm²"
    return f"{wording.number(1e-6 * (gas.number_density_per_m3 or 0.0), 4)} 1/cm³"
