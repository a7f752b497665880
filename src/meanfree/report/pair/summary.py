"""`summary.json` of `collide`: two gases for a program.

Keys end in their unit; null means "not asked" or "does not apply": what is per volume in a plane,
and what is per area in space.
"""

from __future__ import annotations

from importlib import metadata
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree import constants, units
from meanfree.collisions import PairCollisions
from meanfree.report.pair.cautions import cautions_of
from meanfree.report.pair.question import PairQuestion
from meanfree.sourced import Sourced

CODATA = "CODATA, as scipy.constants has it"


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class ConstantInUse(_Record):
    """A physical constant with its source."""

    name: str
    value: float
    unit: str
    source: str


class PartnerAnswer(_Record):
    """One of the two gases: what it is, how fast it moves, what it meets."""

    gas: str
    formula: str | None
    cas: str | None
    molar_mass_kg_per_mol: float
    molar_mass_source: str
    diameter_m: float
    diameter_source: str
    mean_speed_m_per_s: float
    root_mean_square_speed_m_per_s: float
    most_probable_speed_m_per_s: float
    mole_fraction: float | None
    concentration_mol_per_m3: float | None
    concentration_mol_per_m2: float | None
    number_density_per_m3: float | None
    number_density_per_m2: float | None
    collisions_with_partner_per_s: float | None
    collisions_with_any_per_s: float | None
    mean_free_path_m: float | None


class CollideSummary(_Record):
    """Everything that `meanfree collide` answers. Z and k count encounters, each once."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-collide-1"] = Field(
        default="meanfree-collide-1", validation_alias="schema", serialization_alias="schema"
    )
    version: str
    gases: list[PartnerAnswer]
    """Two gases, or the one that meets itself."""
    in_plane: bool
    like_partners: bool
    """True where both partners are one gas; Z, k and the density then carry the half."""
    counts: Literal["events"] = "events"
    T_K: float
    T_source: str
    pressure_Pa: float | None
    pressure_source: str | None
    coverage_mol_per_m2: float | None
    reduced_molar_mass_kg_per_mol: float
    reduced_mass_kg: float
    mean_relative_speed_m_per_s: float
    pair_diameter_m: float
    cross_section_m2: float | None
    swept_width_m: float | None
    Z_m3_per_mol_s: float | None
    Z_L_per_mol_s: float | None
    Z_cm3_per_molecule_s: float | None
    Z_m2_per_mol_s: float | None
    Z_cm2_per_molecule_s: float | None
    E0_J_per_mol: float | None
    Ea_J_per_mol: float | None
    Ea_below_half_RT: bool
    fraction_above_E0: float | None
    k_m3_per_mol_s: float | None
    k_L_per_mol_s: float | None
    k_cm3_per_molecule_s: float | None
    k_m2_per_mol_s: float | None
    k_cm2_per_molecule_s: float | None
    collision_density_mol_per_m3_s: float | None
    collision_density_per_m3_s: float | None
    collision_density_mol_per_m2_s: float | None
    collision_density_per_m2_s: float | None
    filled_fraction: float | None
    cautions: list[str]
    constants: list[ConstantInUse]

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"


def summarise_pair(question: PairQuestion) -> CollideSummary:
    """The summary of what was asked."""
    pair = question.collisions()
    crowd = pair.crowd
    density = None if crowd is None else crowd.collision_density
    below = bool(question.barrier.below_half_rt)
    given = question.has_threshold
    k = pair.rate_constant if given else None
    Ea = pair.activation_energy
    if below and question.activation_energy is not None:
        Ea = question.activation_energy.value
    return CollideSummary(
        version=metadata.version("meanfree"),
        gases=[_partner(question, pair, place) for place in range(1 if pair.same_gas else 2)],
        in_plane=pair.in_plane,
        like_partners=pair.same_gas,
        T_K=pair.temperature,
        T_source=question.temperature.source,
        pressure_Pa=None if question.pressure is None else question.pressure.value,
        pressure_source=None if question.pressure is None else question.pressure.source,
        coverage_mol_per_m2=None if question.coverage is None else question.coverage.value,
        reduced_molar_mass_kg_per_mol=pair.reduced_molar_mass,
        reduced_mass_kg=pair.reduced_molar_mass / constants.N_A,
        mean_relative_speed_m_per_s=pair.mean_relative_speed,
        pair_diameter_m=pair.pair_diameter,
        cross_section_m2=None if pair.in_plane else pair.target,
        swept_width_m=pair.target if pair.in_plane else None,
        E0_J_per_mol=pair.threshold if given else None,
        Ea_J_per_mol=Ea if given else None,
        Ea_below_half_RT=below,
        fraction_above_E0=pair.fraction_above if given else None,
        filled_fraction=None if crowd is None else crowd.filled_fraction,
        cautions=list(cautions_of(question, pair)),
        constants=[
            ConstantInUse(name="R", value=constants.R, unit="J/mol/K", source=CODATA),
            ConstantInUse(name="N_A", value=constants.N_A, unit="1/mol", source=CODATA),
        ],
        **_in_units("Z", pair.ceiling, pair.in_plane),
        **_in_units("k", k, pair.in_plane),
        **_density(density, pair.in_plane),
    )


def _in_units(name: str, value: float | None, in_plane: bool) -> dict[str, Any]:
    """A rate constant under each of its units; None in those that do not apply."""

    def shown(unit: str, dimension: str, applies: bool) -> float | None:
        if value is None or not applies:
            return None
        return units.from_si(value, unit, dimension)

    second, plane = units.rate_constant(2), "rate constant in a plane"
    return {
        f"{name}_m3_per_mol_s": shown("m^3/mol/s", second, not in_plane),
        f"{name}_L_per_mol_s": shown("L/mol/s", second, not in_plane),
        f"{name}_cm3_per_molecule_s": shown("cm^3/molecule/s", second, not in_plane),
        f"{name}_m2_per_mol_s": shown("m^2/mol/s", plane, in_plane),
        f"{name}_cm2_per_molecule_s": shown("cm^2/molecule/s", plane, in_plane),
    }


def _density(value: float | None, in_plane: bool) -> dict[str, Any]:
    """Encounters of the two in a second, per volume or per area."""
    counted = None if value is None else value * constants.N_A
    return {
        "collision_density_mol_per_m3_s": None if in_plane else value,
        "collision_density_per_m3_s": None if in_plane else counted,
        "collision_density_mol_per_m2_s": value if in_plane else None,
        "collision_density_per_m2_s": counted if in_plane else None,
    }


def _partner(question: PairQuestion, pair: PairCollisions, place: int) -> PartnerAnswer:
    gas = question.gases[place]
    crowd = pair.crowd
    amount = None if crowd is None else crowd.concentrations[place]
    in_space, in_plane = (None, amount) if pair.in_plane else (amount, None)
    return PartnerAnswer(
        gas=gas.name,
        formula=None if gas.formula is None else str(gas.formula),
        cas=gas.cas,
        molar_mass_kg_per_mol=pair.molar_masses[place],
        molar_mass_source=_source(gas.molar_mass),
        diameter_m=pair.diameters[place],
        diameter_source=_source(gas.diameter),
        mean_speed_m_per_s=pair.mean_speeds[place],
        root_mean_square_speed_m_per_s=pair.root_mean_square_speeds[place],
        most_probable_speed_m_per_s=pair.most_probable_speeds[place],
        mole_fraction=None if crowd is None else crowd.mole_fractions[place],
        concentration_mol_per_m3=in_space,
        concentration_mol_per_m2=in_plane,
        number_density_per_m3=None if in_space is None else in_space * constants.N_A,
        number_density_per_m2=None if in_plane is None else in_plane * constants.N_A,
        collisions_with_partner_per_s=None
        if crowd is None
        else crowd.frequencies_with_partner[place],
        collisions_with_any_per_s=None if crowd is None else crowd.frequencies[place],
        mean_free_path_m=None if crowd is None else crowd.mean_free_paths[place],
    )


def _source(value: Sourced | None) -> str:
    return "" if value is None else value.source
